"""Coefficients of the indistinguishability of photons that leave a detuned resonator.

Made by tests/derivations/indistinguishability.py, which explains the model; do not edit.

Rates are in units of kappa: G = 4 (g/kappa)^2, a = gamma/kappa, b = dephasing/kappa,
x = 4 (detuning/kappa)^2, and

    I = CAVITY_SHARE * OVERLAP / (COHERENCE_DECAY * SPECTRUM * TWO_TIMES).

Each polynomial is table[power of x][power of G][power of b][power of a]; trailing zeros are left
out and no coefficient is negative, so that nothing cancels. CAVITY_SHARE is also the denominator
of the share that leaves through the mode, G (1 + a + b)/CAVITY_SHARE.
"""

Table = tuple[tuple[tuple[tuple[int, ...], ...], ...], ...]

CAVITY_SHARE: Table = ((((0, 1, 2, 1), (0, 2, 2), (0, 1)), ((1, 2, 1), (1, 1))), (((0, 1),),))

OVERLAP: Table = (
    (
        (
            (9, 87, 325, 603, 603, 325, 87, 9),
            (60, 461, 1323, 1814, 1254, 413, 51),
            (154, 921, 1964, 1870, 794, 121),
            (201, 898, 1336, 786, 155),
            (145, 453, 419, 115),
            (58, 113, 49),
            (12, 11),
            (1,),
        ),
        (
            (24, 152, 336, 336, 152, 24),
            (101, 460, 706, 436, 89),
            (148, 466, 444, 126),
            (96, 188, 84),
            (28, 26),
            (3,),
        ),
        ((16, 48, 48, 16), (28, 56, 28), (14, 14), (2,)),
    ),
    (
        (
            (10, 42, 76, 76, 42, 10),
            (12, 70, 154, 126, 38),
            (14, 100, 138, 56),
            (22, 66, 40),
            (12, 14),
            (2,),
        ),
        ((8, 24, 24, 8), (5, 22, 17), (6, 12), (3,)),
    ),
    (((1, 3, 3, 1), (0, 1, 3), (0, 3), (1,)),),
)

COHERENCE_DECAY: Table = ((((1, 1), (1,)),),)

SPECTRUM: Table = (
    (((0, 1, 2, 1), (1, 4, 3), (2, 3), (1,)), ((1, 2, 1), (2, 2), (1,))),
    (((0, 1), (1,)),),
)

TWO_TIMES: Table = (
    (
        (
            (9, 78, 247, 356, 247, 78, 9),
            (33, 221, 514, 514, 221, 33),
            (46, 224, 356, 224, 46),
            (30, 98, 98, 30),
            (9, 18, 9),
            (1, 1),
        ),
        ((24, 128, 208, 128, 24), (56, 200, 200, 56), (46, 100, 46), (16, 16), (2,)),
        ((16, 32, 16), (16, 16), (4,)),
    ),
    (((10, 32, 44, 32, 10), (18, 46, 46, 18), (10, 20, 10), (2, 2)), ((8, 16, 8), (8, 8), (2,))),
    (((1, 2, 1), (1, 1)),),
)
