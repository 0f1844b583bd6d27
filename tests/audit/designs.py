"""Netlists for the tests of the audit, written into folders of their own."""

SOUND = """gauge input stage
VIN in 0 SIN(0 0.2 1k)
R1 in n 10k
R2 n out 20k
RL out 0 10k
RP p 0 6.8k
XU1 p n vp vn out TL072
VP vp 0 12
VN vn 0 -12
CP vp 0 100n
CN vn 0 100n
CB vp 0 10u
CD vn 0 10u
.end
"""

CLIPPED = SOUND.replace("R2 n out 20k", "R2 n out 2000k")

BARE = "".join(
    line for line in SOUND.splitlines(keepends=True) if line[:2] not in ("CP", "CN", "CB", "CD")
)

UNKNOWN = SOUND.replace("TL072", "ZZ9101")

LIBRARY = """* models of the station
.subckt FILTER a b
R1 a b 1k
C1 b 0 1n
.ends
.model D1N D(IS=1n)
"""


def put(folder, **files):
    """Write texts below a folder: `put(folder, **{"a/b.cir": SOUND})`."""
    for name, text in files.items():
        place = folder / name
        place.parent.mkdir(parents=True, exist_ok=True)
        place.write_text(text)
    return folder
