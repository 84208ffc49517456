//! The commands as a person types them: help, errors, exit status, the files written.

mod cli {
    pub mod contract;
    pub mod folders;
    pub mod rerun;
    pub mod run;
    pub mod typed;
}
