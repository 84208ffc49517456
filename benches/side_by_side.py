"""Whole trials side by side with general numerical libraries, one thread each.

    pip install -r benches/requirements.txt
    python benches/side_by_side.py

Builds and runs the bench `side_by_side`, which times whole trials: drawing, far field
and all figures. Non-uniform transforms of the same points onto the same map are timed
without any of the rest, once with everything in one call and once with the points
sorted in advance. A small array is also done the plain way: painted on a grid and
transformed. Before any time is printed, the maps are compared; the script fails when
they differ.
"""

import copy
import json
import pathlib
import statistics
import subprocess
import time

import ducc0
import finufft
import numpy as np
import scipy.fft
import scipy.special

REPOSITORY = pathlib.Path(__file__).resolve().parent.parent
REPEATS = 9
TOLERANCE = 1e-6  # of the transforms, and of the amplitudes compared
CELLS = 16  # across an element, where arrays are painted
PADDING = 4
SHARES = (0.5, 0.8, 1 - np.exp(-2))
SHARE_KEYS = [f"encircled_{percent}_diameter" for percent in (50, 80, 86)]
ERRORS = {"piston_rad": 2 * np.pi * 50e-9 / 1e-6, "jitter_rad": 0.5e-6,
          "dropout": 0.02, "power_spread": 0.05}


def facula():
    """Run the Rust side and return its report."""
    command = ["cargo", "bench", "--quiet", "--bench", "side_by_side", "--", "--json"]
    run = subprocess.run(command, cwd=REPOSITORY, check=True, stdout=subprocess.PIPE)
    return json.loads(run.stdout)


def repeated(function):
    """Seconds of each of several calls, after one that is not timed."""
    function()
    seconds = []
    for _ in range(REPEATS):
        start = time.perf_counter()
        function()
        seconds.append(time.perf_counter() - start)
    return seconds


class Case:
    """Positions of a square of elements and directions of its map."""

    def __init__(self, report, side, pixel_m):
        self.side, self.pixel_m = side, pixel_m
        self.pixels, self.size_m = report["pixels"], report["size_m"]
        self.wavelength_m, self.range_m = report["wavelength_m"], report["range_m"]
        along = (np.arange(side) - (side - 1) / 2) * self.size_m
        # Periods of the map's sampling: one is wavelength * range / pixel.
        along *= pixel_m / (self.wavelength_m * self.range_m)
        y, x = np.meshgrid(along, along, indexing="ij")
        self.periods = np.stack([y.ravel(), x.ravel()], axis=1)
        self.axis_m = (np.arange(self.pixels) - self.pixels // 2) * pixel_m
        self.radius_m = np.hypot(self.axis_m[:, None], self.axis_m[None, :])

    def by_ducc0(self, strengths):
        """Array factor on the map, in the precision of the strengths."""
        return ducc0.nufft.nu2u(
            points=strengths, coord=self.periods, forward=True, epsilon=TOLERANCE,
            nthreads=1, periodicity=1.0,
            out=np.empty((self.pixels, self.pixels), strengths.dtype))

    def irradiance(self, strengths, element_power_w):
        """Irradiance of round elements that do not tilt."""
        factor = self.by_ducc0(strengths)
        k = 2 * np.pi / self.wavelength_m
        argument = np.maximum(k * self.size_m / 2 * self.radius_m / self.range_m, 1e-9)
        pattern = 2 * scipy.special.j1(argument) / argument
        area = np.pi * self.size_m**2 / 4
        scale = element_power_w * area / (self.wavelength_m * self.range_m) ** 2
        return np.abs(factor * pattern) ** 2 * scale


class Painted:
    """The plain way: elements painted on a padded grid, one FFT, figures by sorting."""

    def __init__(self, case, element_power_w):
        self.case, self.power_w = case, element_power_w
        self.length = PADDING * CELLS * case.side
        self.cell_m = case.size_m / CELLS
        fine = (np.arange(16 * CELLS) + 0.5) / (16 * CELLS) - 0.5
        inside = np.hypot(fine[:, None], fine[None, :]) <= 0.5
        stamp = inside.reshape(CELLS, 16, CELLS, 16).mean(axis=(1, 3))
        area_m2 = np.pi * case.size_m**2 / 4
        self.stamp = stamp * np.sqrt(element_power_w / area_m2) * self.cell_m**2
        self.offset_m = (np.arange(CELLS) + 0.5) * self.cell_m - case.size_m / 2
        self.bins = np.arange(case.pixels) - case.pixels // 2
        mean_of_cell = np.sinc(self.bins / self.length)
        self.scale = 1 / (np.outer(mean_of_cell, mean_of_cell)
                          * case.wavelength_m * case.range_m) ** 2
        self.order = np.argsort(case.radius_m, axis=None)
        self.sorted_m = case.radius_m.ravel()[self.order]
        self.generator = np.random.default_rng(1)
        still = self.paint(np.ones(case.side**2), 0, np.zeros(case.side**2),
                           np.zeros(case.side**2))
        self.ideal = self.irradiance(still)

    def draw(self):
        """Amplitude, phase and tilts of every element."""
        normal, count = self.generator.standard_normal, self.case.side**2
        sigma = np.sqrt(np.log1p(ERRORS["power_spread"] ** 2))
        amplitude = np.exp((sigma * normal(count) - sigma**2 / 2) / 2)
        amplitude[self.generator.random(count) < ERRORS["dropout"]] = 0
        tilts = ERRORS["jitter_rad"] * normal((2, count))
        return amplitude, ERRORS["piston_rad"] * normal(count), *tilts

    def paint(self, amplitude, phase_rad, tilt_x_rad, tilt_y_rad):
        """Field of the aperture, cell by cell, without padding."""
        side, k = self.case.side, 2j * np.pi / self.case.wavelength_m
        strength = amplitude * np.exp(1j * phase_rad)
        along_x = np.exp(k * np.outer(tilt_x_rad, self.offset_m))
        along_y = np.exp(k * np.outer(tilt_y_rad, self.offset_m)) * strength[:, None]
        along_x = along_x.reshape(side, 1, side, CELLS)
        along_y = along_y.reshape(side, side, CELLS).transpose(0, 2, 1)[..., None]
        field = along_y * along_x * self.stamp[None, :, None, :]
        return field.reshape(side * CELLS, side * CELLS)

    def irradiance(self, aperture, pruned=False):
        """Map by one padded FFT; `pruned` skips lines without light and lines not kept."""
        shape = (self.length, self.length)
        if pruned:
            rows = scipy.fft.fft(aperture, self.length, axis=1, workers=1)[:, self.bins]
            field = scipy.fft.fft(rows, self.length, axis=0, workers=1)[self.bins]
        else:
            field = scipy.fft.fft2(aperture, shape, workers=1)
            field = field[np.ix_(self.bins, self.bins)]
        return (field.real**2 + field.imag**2) * self.scale

    def figures(self, irradiance, power_w):
        """Strehl ratio, peak, and the circles that hold the shares of the power."""
        centre = self.case.pixels // 2
        within = np.cumsum(irradiance.ravel()[self.order]) * self.case.pixel_m**2
        places = np.searchsorted(within, np.multiply(SHARES, power_w))
        # A circle must lie inside the map.
        inside = np.searchsorted(self.sorted_m, self.case.axis_m[-1], side="right")
        diameters = (2 * self.sorted_m[place] if place < inside else None
                     for place in places)
        strehl = irradiance[centre, centre] / self.ideal[centre, centre]
        return dict(zip(SHARE_KEYS, diameters), strehl=strehl,
                    peak_irradiance=irradiance.max())

    def trial(self, pruned):
        """A whole trial."""
        draw = self.draw()
        irradiance = self.irradiance(self.paint(*draw), pruned)
        return self.figures(irradiance, self.power_w * np.sum(draw[0] ** 2))


def agree(what, found, expected, peak, tolerance):
    """Fail unless two maps of irradiance agree in amplitude."""
    difference = np.abs(np.sqrt(found) - np.sqrt(expected)).max() / np.sqrt(peak)
    print(f"{what}: amplitudes differ by {difference:.1e} of the peak, "
          f"allowed {tolerance:.0e}")
    if not difference <= tolerance:
        raise SystemExit("the maps do not agree")


def compare_results(report, painted):
    """Hold facula's maps to those computed here."""
    for name, side in (("pistons", 64), ("still", 1000)):
        there = report["maps"][name]
        case = Case(report, side, there["pixel_m"])
        phase_rad = np.zeros(side**2)
        if there["draw"] is not None:
            phase_rad = np.array(there["draw"]["phase_rad"])
        power_w = there["element_power_w"]
        found = np.reshape(there["irradiance_w_m2"], (case.pixels, case.pixels))
        expected = case.irradiance(np.exp(1j * phase_rad), power_w)
        peak = case.irradiance(np.ones(side**2, complex), power_w).max()
        agree(f"{side} x {side}, {name}, against ducc0", found, expected, peak, TOLERANCE)
    there = report["maps"]["small"]
    draw = {key: np.array(value) for key, value in there["draw"].items()}
    found = np.reshape(there["irradiance_w_m2"], painted.ideal.shape)
    expected = painted.irradiance(painted.paint(**draw))
    # Cells at an element's edge are painted with their covered area: a part in a thousand.
    agree("64 x 64, every error, against the painted array", found, expected,
          painted.ideal.max(), 1e-3)
    power_w = painted.power_w * np.sum(draw["amplitude"] ** 2)
    for key, here in painted.figures(expected, power_w).items():
        other = there["figures"][key]
        values = (each if each is None else f"{each:.6g}" for each in (other, here))
        print("    {}: {}, painted {}".format(key, *values))


def strengths_of(case):
    """Phasors of about the usual errors, and their points as the libraries take them."""
    generator = np.random.default_rng(1)
    phase_rad = ERRORS["piston_rad"] * generator.standard_normal(case.side**2)
    y, x = (np.ascontiguousarray(2 * np.pi * each) for each in case.periods.T)
    return np.exp(1j * phase_rad), y, x


def transforms(case):
    """Seconds of the transforms alone: everything in one call, and points sorted before."""
    strengths, y, x = strengths_of(case)
    shape = (case.pixels, case.pixels)
    seconds = {
        "ducc0": repeated(lambda: case.by_ducc0(strengths)),
        "finufft": repeated(lambda: finufft.nufft2d1(
            y, x, strengths, shape, eps=TOLERANCE, isign=-1, nthreads=1)),
    }
    plan = ducc0.nufft.plan(nu2u=True, coord=case.periods, grid_shape=shape,
                            epsilon=TOLERANCE, nthreads=1, periodicity=1.0)
    seconds["ducc0, sorted"] = repeated(
        lambda: plan.nu2u(forward=True, points=strengths))
    plan = finufft.Plan(1, shape, eps=TOLERANCE, isign=-1, nthreads=1)
    plan.setpts(y, x)
    seconds["finufft, sorted"] = repeated(lambda: plan.execute(strengths))
    # Single precision falls short of the tolerance by a factor of two, but is faster.
    strengths, y, x = (strengths.astype(np.complex64), y.astype(np.float32),
                       x.astype(np.float32))
    single = copy.copy(case)
    single.periods = case.periods.astype(np.float32)
    seconds["ducc0, single precision"] = repeated(lambda: single.by_ducc0(strengths))
    plan = finufft.Plan(1, shape, eps=TOLERANCE, isign=-1, nthreads=1, dtype="complex64")
    plan.setpts(y, x)
    seconds["finufft, sorted, single precision"] = repeated(
        lambda: plan.execute(strengths))
    return seconds


def line(what, seconds):
    """Print one line of the table."""
    print(f"{what:<66}{min(seconds) * 1e3:>10.3f}{statistics.median(seconds) * 1e3:>10.3f}")


def ratio(what, above, below):
    """Print the ratio of two times, by minimum and by median."""
    of_median = statistics.median(above) / statistics.median(below)
    print(f"{what:<66}{min(above) / min(below):>10.3f}{of_median:>10.3f}")


def main():
    """Compare results, then print times and ratios."""
    report = facula()
    small = report["maps"]["small"]
    painted = Painted(Case(report, 64, small["pixel_m"]), small["element_power_w"])
    compare_results(report, painted)

    large = next(each for each in report["growth"] if each["side"] == 1000)
    others = transforms(Case(report, 1000, large["pixel_m"]))
    plain = repeated(lambda: painted.trial(False))
    pruned = repeated(lambda: painted.trial(True))

    print(f"\n{'milliseconds, one thread':<66}{'least':>10}{'median':>10}")
    line("facula, 1000 x 1000, whole trial", large["trial_s"])
    for name, seconds in others.items():
        line(f"{name}, 1000 x 1000, transform alone", seconds)
    line("facula, 64 x 64, whole trial", report["small"]["trial_s"])
    line("NumPy and SciPy, 64 x 64, whole trial", plain)
    line("NumPy and SciPy, 64 x 64, whole trial, pruned FFT", pruned)

    print(f"\n{'ratios':<66}{'least':>10}{'median':>10}")
    for name, seconds in others.items():
        ratio(f"facula, whole trial / {name}, transform alone", large["trial_s"], seconds)
    ratio("NumPy and SciPy / facula", plain, report["small"]["trial_s"])
    ratio("NumPy and SciPy, pruned FFT / facula", pruned, report["small"]["trial_s"])

    print(f"\n{'elements':>10}{'set-up ms':>12}{'least ms':>12}{'median ms':>12}"
          f"{'ns/element':>12}  method")
    for each in report["growth"]:
        least, median = min(each["trial_s"]), statistics.median(each["trial_s"])
        print(f"{each['elements']:>10}{each['setup_s'] * 1e3:>12.2f}{least * 1e3:>12.3f}"
              f"{median * 1e3:>12.3f}{least / each['elements'] * 1e9:>12.2f}"
              f"  {each['method']}")


if __name__ == "__main__":
    main()
