"""Two drifts to a threshold, and the times to it by a straight line through each component's own readings.

Data: Tobias and Trindade, Applied Reliability, 2nd ed.: p. 201, resistors' drift in percent at 24, 96 and 168 h, ten
components at each of two temperatures (°C), failure at 30 %; p. 216, threshold voltage at 0, 500 and 1000 h, failure
below 0.50 V. The straight lines are the book's method (through zero drift at 0 h for the resistors), recomputed by
least squares over all three readings.
"""

from __future__ import annotations

RESISTOR_HOURS = (24.0, 96.0, 168.0)
RESISTOR_FAILURE_PERCENT = 30.0
RESISTOR_PERCENT: dict[tuple[int, int], tuple[float, float, float]] = {
    (1, 105): (1.0, 6.0, 11.1),
    (2, 105): (0.0, 0.4, 1.3),
    (3, 105): (1.1, 4.5, 6.4),
    (4, 105): (0.0, 1.7, 2.7),
    (5, 105): (1.5, 5.4, 9.4),
    (6, 105): (0.8, 4.3, 6.4),
    (7, 105): (0.9, 2.6, 3.9),
    (8, 105): (0.0, 3.0, 5.5),
    (9, 105): (2.0, 6.0, 10.1),
    (10, 105): (0.6, 0.7, 0.3),
    (1, 125): (7.1, 27.1, 46.8),
    (2, 125): (0.6, 3.6, 5.3),
    (3, 125): (3.0, 12.9, 21.7),
    (4, 125): (2.5, 11.6, 18.5),
    (5, 125): (0.3, 3.1, 7.5),
    (6, 125): (0.9, 3.3, 5.4),
    (7, 125): (2.8, 11.2, 21.2),
    (8, 125): (1.8, 10.8, 18.2),
    (9, 125): (5.3, 22.0, 38.4),
    (10, 125): (3.5, 13.4, 22.4),
}
RESISTOR_HOURS_TO_FAILURE: dict[tuple[int, int], float] = {
    (1, 105): 462.7,
    (2, 105): 4441.1,
    (3, 105): 743.7,
    (4, 105): 1849.0,
    (5, 105): 534.5,
    (6, 105): 756.7,
    (7, 105): 1231.1,
    (8, 105): 941.0,
    (9, 105): 491.4,
    (10, 105): 8640.0,
    (1, 125): 107.2,
    (2, 125): 912.1,
    (3, 125): 230.1,
    (4, 125): 266.4,
    (5, 125): 728.8,
    (6, 125): 915.6,
    (7, 125): 242.4,
    (8, 125): 275.6,
    (9, 125): 131.2,
    (10, 125): 222.2,
}

VOLTAGE_HOURS = (0.0, 500.0, 1000.0)
VOLTAGE_FAILURE_V = 0.50
VOLTAGE_V: dict[int, tuple[float, float, float]] = {
    1: (0.99, 0.83, 0.68),
    2: (0.82, 0.72, 0.65),
    3: (0.96, 0.88, 0.8),
    4: (0.87, 0.72, 0.6),
    5: (0.91, 0.85, 0.78),
}
VOLTAGE_HOURS_TO_FAILURE: dict[int, float] = {
    1: 1575.3,
    2: 1852.9,
    3: 2875.0,
    4: 1351.9,
    5: 3166.7,
}
