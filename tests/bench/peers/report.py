"""Who is faster: ratios at no larger error, and the tables made of them."""

from .measure import DOUBLE_DOUBLE, LANES

# Rounding alone leaves every double-precision code anywhere below this, by luck of the steps.
LUCK = {"nrho_30": 1e-7}
# What is aimed at, by kind of case, and by path where it hangs on the width of the lanes.
AIMS = {
    "single": {"avx512": 3.0, "avx2": 3.0},
    "ensemble": {"avx512": 3.0, "avx2": 2.2},
    "matrix": {"avx512": 3.5, "avx2": 2.5},
    "lanes": {"avx512": 5.5, "avx2": 2.7},
}
# The most that double-double arithmetic may cost, in times of the double run.
DOUBLE_DOUBLE_AIM = 150.0
# The peer of a narrow path has no wider lanes than it.
WIDER = {"avx2": "batch of 8"}
SCIPY, SCIPY_CASE, SCIPY_AIM = "scipy DOP853", "halo_period", 700.0

LABELS = {
    "halo_period": "a halo orbit, one period",
    "nrho_30": "a near-rectilinear orbit, 20 revolutions",
    "arenstorf": "Arenstorf's orbit, one period",
    "ensemble_10k": "10,000 trajectories of all kinds, t = 10, each",
    "stm_halo": "the halo orbit with its matrix",
    "stm_nrho": "a near-rectilinear revolution with its matrix",
    "stm_halo_lanes": "the halo orbit with its matrix, 256 at once, each",
    "stm_nrho_lanes": "the revolution with its matrix, 256 at once, each",
}


def compare(ours, name, peers):
    """Ours against one peer."""
    return {
        "peer": name,
        "peer_seconds": peers[name]["seconds"],
        "peer_error": peers[name]["error"],
        "ratio": peers[name]["seconds"] / ours["seconds"],
    }


def ratios(cases):
    """A row for each case, variant and path: against the fastest peer with an error not smaller than ours."""
    rows = []
    for name, case in cases.items():
        luck = LUCK.get(name, 0.0)
        for variant, by_path in case["ours"].items():
            if variant.endswith(DOUBLE_DOUBLE):
                continue
            kind = "lanes" if variant.endswith(LANES) else case["kind"]
            for path, ours in by_path.items():
                row = {"case": variant, "path": path, "seconds": ours["seconds"], "error": ours["error"]}
                narrow = {p: o for p, o in case["peers"].items() if WIDER.get(path, "\0") not in p}
                less = {p: o for p, o in narrow.items() if max(o["error"], luck) >= ours["error"]}
                aim = AIMS[kind].get(path)
                if less:
                    row |= compare(ours, min(less, key=lambda p: less[p]["seconds"]), less)
                # Without regard to the error: a peer both faster and more accurate than the one above is not hidden.
                if narrow:
                    row["fastest"] = compare(ours, min(narrow, key=lambda p: narrow[p]["seconds"]), narrow)
                rows.append(row | {"aim": aim})
                if variant == SCIPY_CASE and SCIPY in less:
                    rows.append(row | compare(ours, SCIPY, less) | {"aim": SCIPY_AIM, "fastest": None})
    return rows


def costs(cases):
    """What double-double arithmetic costs, in times of the double run by the same path."""
    rows = []
    for name, case in cases.items():
        for path, fine in case["ours"].get(name + DOUBLE_DOUBLE, {}).items():
            factor = fine["seconds"] / case["ours"][name][path]["seconds"]
            rows.append({"case": name, "path": path, "factor": factor, "aim": DOUBLE_DOUBLE_AIM} | fine)
    return rows


def duration(seconds):
    return f"{seconds * 1e6:.3g} µs" if seconds < 1e-3 else f"{seconds * 1e3:.3g} ms"


def cell(seconds, error):
    return f"{duration(seconds)} ({error:.0e})"


def markdown(result):
    """The ratio table, one line a case, variant and path."""
    lines = [
        "| What | Path | Synodia | Fastest peer | Ratio | Aim |",
        "| --- | --- | ---: | ---: | ---: | ---: |",
    ]
    for row in result["ratios"]:
        peer, ratio = "none", ""
        if "peer" in row:
            peer = f"{row['peer']}: {cell(row['peer_seconds'], row['peer_error'])}"
            ratio = f"{row['ratio']:.3g}"
        aim = "" if row["aim"] is None else f"{row['aim']:.3g}"
        ours = cell(row["seconds"], row["error"])
        lines.append(f"| {LABELS[row['case']]} | {row['path']} | {ours} | {peer} | {ratio} | {aim} |")
    for row in result["ratios"]:
        fastest = row.get("fastest")
        if fastest and fastest["peer"] != row.get("peer"):
            there = cell(fastest["peer_seconds"], fastest["peer_error"])
            lines += ["", f"Faster and more accurate on {row['case']} ({row['path']}): {fastest['peer']}, {there}."]
    for row in result["double_double"]:
        text = f"{LABELS[row['case']]} ({row['path']}): {cell(row['seconds'], row['error'])}"
        lines += ["", f"In double-double arithmetic, {text}, {row['factor']:.3g} times the double run."]
    return "\n".join(lines)


def machine_line(machine):
    """Where the table was measured and against what."""
    libraries = ", ".join(f"{name} {version}" for name, version in machine["libraries"].items())
    return f"One core of {machine['cpu']}; {libraries}; Python {machine['python']}."


def every_time(result):
    """All times of all peers."""
    lines = []
    for name, case in result["cases"].items():
        lines += ["", f"| {name} | time | least | error |", "| --- | ---: | ---: | ---: |"]
        entries = {f"synodia {v} {path}": o for v, paths in case["ours"].items() for path, o in paths.items()}
        for who, one in sorted((entries | case["peers"]).items(), key=lambda entry: entry[1]["seconds"]):
            lines.append(f"| {who} | {duration(one['seconds'])} | {duration(one['min'])} | {one['error']:.1e} |")
    return "\n".join(lines[1:])
