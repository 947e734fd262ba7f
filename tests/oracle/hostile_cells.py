"""Thresholds of one ear through time, chosen near the limits of the review."""

import random

MEAN_FREQUENCIES = (2000, 3000, 4000)
# Sums over three frequencies in tenths of a dB: 300 is a shift of exactly 10, 290 is 9.67, -150 an improvement of 5.
TELLING_SUMS = (
    300,
    300,
    300,
    299,
    301,
    290,
    295,
    250,
    350,
    400,
    150,
    0,
    0,
    50,
    -50,
    -150,
    -150,
    -149,
    -140,
    -200,
    -300,
)
TELLING_LEVELS = (750, 750, 749, 751, 740, 700, 800)  # sums that give a mean of 25 dB HL and its neighbours
START_SUMS = (450, 450, 450, 440, 400, 350, 300, 150, 600, 900)
# Sums of successive periodic tests: a shift below 25 dB HL that lasts (the baseline may be revised), then a level of
# 25 dB that is a shift of 10 dB from the first baseline only, then one from the revised baseline too.
CREEPING = (300, 620, 620, 750, 749, 750, 930)
NO_RESPONSE_LEVELS = (90, 95, 100, 25, 30, 20, 45)


def split_sum(rng: random.Random, total: int) -> list[int]:
    """Three numbers of the sum `total`, equal or uneven, in a random order."""
    kind = rng.randrange(4)
    if kind == 0:
        first = second = round(total / 3)
    elif kind == 1:
        first, second = 50 * rng.randrange(-2, 5), 50 * rng.randrange(-2, 5)
    elif kind == 2:
        first, second = total, 0
    else:
        first, second = rng.randrange(-80, 200), 75
    parts = [first, second, total - first - second]
    rng.shuffle(parts)
    return parts


def write_number(rng: random.Random, tenths: int) -> str:
    """A measured value as text."""
    sign, whole, part = "-" if tenths < 0 else "", abs(tenths) // 10, abs(tenths) % 10
    return f"{sign}{whole}.{part}" if part or rng.random() < 0.1 else f"{sign}{whole}"


def write_no_response(rng: random.Random, level: int) -> str:
    return rng.choice((f"NR@{level}", f">{level}", f"{level}+", "NR"))


class EarStory:
    """Makes the cells of one ear, test after test."""

    def __init__(self, rng: random.Random, frequencies: list[int]):
        self.rng = rng
        self.others = [frequency for frequency in frequencies if frequency not in MEAN_FREQUENCIES]
        self.script = list(CREEPING) if rng.random() < 0.2 else []
        self.levels: list[list[int]] = []  # per test, tenths at 2, 3, 4 kHz
        self.other_cells = {hz: rng.choice(("10", "15", "20", "NR", "NR@90", "")) for hz in self.others}
        self.missing_rate = rng.choice((0.0,) * 12 + (0.02, 0.02, 0.02, 0.1))
        self.silent = rng.sample(MEAN_FREQUENCIES, rng.choice((0,) * 14 + (1, 1, 1, 2)))
        self.silent_rate = rng.choice((0.1, 0.5, 0.9))

    def next_cells(self, allowances: list[int], looks_like_retest: bool) -> dict[int, str]:
        """Cells of the next test; `allowances`: age correction since each earlier test, dB summed over three."""
        rng = self.rng
        levels = self.next_levels(allowances, looks_like_retest)
        self.levels.append(levels)
        cells = {hz: write_number(rng, tenths) for hz, tenths in zip(MEAN_FREQUENCIES, levels, strict=True)}
        for frequency in self.silent:
            if rng.random() < self.silent_rate:
                cells[frequency] = write_no_response(rng, rng.choice(NO_RESPONSE_LEVELS))
        self.step_others()
        cells.update(self.other_cells)
        whole_ear = rng.random() < self.missing_rate / 3
        for frequency in list(cells):
            if whole_ear or rng.random() < self.missing_rate:
                cells[frequency] = rng.choice(("", "DNT", "CNT"))
        return cells

    def next_levels(self, allowances: list[int], looks_like_retest: bool) -> list[int]:
        rng = self.rng
        if self.script and not looks_like_retest:
            return split_even(rng, self.script.pop(0))
        if not self.levels:
            return split_even(rng, rng.choice(START_SUMS))
        if rng.random() < (0.5 if looks_like_retest else 0.45):  # stays as it was: same sum, or a trifle off
            levels = rng.sample(self.levels[-1], 3)
            levels[0] += rng.choice((0, 0, 0, 1, -1, 50, -50))
        elif rng.random() < 0.2:
            levels = split_even(rng, rng.choice(TELLING_LEVELS))
        else:
            since = rng.choice((0, 0, 0, len(self.levels) - 1, rng.randrange(len(self.levels))))
            total = rng.choice(TELLING_SUMS) + rng.choice((0, 10 * allowances[since]))
            levels = [a + b for a, b in zip(self.levels[since], split_sum(rng, total), strict=True)]
        return [min(max(level, -150), 1100) for level in levels]

    def step_others(self) -> None:
        """Move the frequencies outside the mean: mostly unchanged, now and then one better or worse, or silent."""
        rng = self.rng
        if not self.others or rng.random() < 0.3:
            return
        frequency = rng.choice(self.others)
        before = self.other_cells[frequency]
        if before.lstrip("-").isdigit() and rng.random() < 0.8:
            self.other_cells[frequency] = str(min(max(int(before) + rng.choice((-5, -5, 5, 5, -5)), -10), 100))
        else:
            self.other_cells[frequency] = rng.choice(("NR@90", "90+", ">85", "NR", "90", "85", "10", "7.5", "", "DNT"))
        if rng.random() < 0.1:  # one better, one fallen silent: worse on the whole
            better, silent = rng.choice(self.others), rng.choice(self.others)
            self.other_cells[better], self.other_cells[silent] = "-5", rng.choice(("NR@95", "NR"))


def split_even(rng: random.Random, total: int) -> list[int]:
    """Three levels of the sum `total` that lie near one another."""
    first = round(total / 3) + rng.choice((0, 0, 50, -50, 3))
    second = round(total / 3) + rng.choice((0, 0, 50, -50))
    levels = [first, second, total - first - second]
    rng.shuffle(levels)
    return levels
