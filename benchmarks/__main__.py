"""Print handbook cases, bands, what elements need, or timings."""

import argparse
import sys

from benchmarks import bands, cases, elements, timing

# What a handbook prints, beside what kplate finds: one line for each figure.
SHOWN = (
    "ssss_u_1", "ssss_u_1.5", "ssss_u_2", "ssss_h_1", "ssss_p_1", "ssss_patch_1",
    "cccc_u_1", "cccc_u_1.5", "cccc_u_2", "cccc_h_1", "cscs_u_1", "csss_u_1",
    "ssfs_u_1", "csfs_u_1", "cfff_u_1", "tri_eq_s_u", "rhomb_c_u_60", "ngon6_c_u",
    "circ_C_u_nu0.3", "circ_S_u_nu0.3", "ann_0.5_iF_oS_u", "hole_ssss_0.15_0.5_F",
)  # fmt: skip


def main() -> int:
    """Run what the command line asks for."""
    parser = argparse.ArgumentParser(prog="python -m benchmarks", description=__doc__)
    commands = parser.add_subparsers(dest="command", metavar="COMMAND")
    shown = commands.add_parser("handbook", help="handbook coefficients (default)")
    for one in (parser, shown):
        one.add_argument(
            "--triangles", type=int, help="about how many to use; else what suits"
        )
        one.add_argument(
            "--all", action="store_true", help="every number of the reference file"
        )
    banded = commands.add_parser("bands", help="bands of numbers with straight sides")
    banded.add_argument(
        "--tolerance", type=float, default=0.01, help="half width wanted, as a share"
    )
    banded.add_argument(
        "--all", action="store_true", help="every problem of the reference file"
    )
    commands.add_parser("elements", help="unknowns and seconds to an error")
    commands.add_parser("timing", help="ratios measured on this machine")
    args = parser.parse_args()
    if args.command == "timing":
        timing.main()
    elif args.command == "bands":
        return int(bands.main(args.tolerance, None if args.all else SHOWN) > 0)
    elif args.command == "elements":
        elements.main()
    else:
        handbook(args.triangles, every=args.all)
    return 0


def handbook(triangles: int | None, *, every: bool) -> None:
    """Print coefficient, computed, deviation and source."""
    header = ("case", "quantity", "reference", "computed", "deviation", "in print")
    line = "{:22s} {:28s} {:>12s} {:>12s} {:>9s} {:>10s}  {}"
    print(line.format(*header, "source"))
    worst: dict[str, list[float]] = {}
    names = [r["id"] for r in cases.records()] if every else SHOWN
    for name in names:
        for row in cases.rows(cases.record(name), triangles=triangles):
            kind = row.quantity.split(" at ")[0]
            worst.setdefault(kind, []).append(abs(row.deviation))
            if not every and row.published is None:
                continue
            printed = "-" if row.published is None else f"{row.published:.5g}"
            source = row.publication or row.source
            print(
                line.format(
                    row.case,
                    row.quantity,
                    f"{row.value:.6g}",
                    f"{row.computed:.6g}",
                    f"{100.0 * row.deviation:+.2f} %",
                    printed,
                    source,
                )
            )
    print("\nkind of quantity        numbers  median deviation  largest")
    for kind, deviations in worst.items():
        ordered = sorted(deviations)
        median = ordered[len(ordered) // 2]
        print(
            f"{kind:22s} {len(ordered):8d}  {100.0 * median:14.3f} %  "
            f"{100.0 * ordered[-1]:6.2f} %"
        )
    print(
        "\nReference values were computed without finite elements (series, closed "
        "forms, collocation);\na printed figure marked 'from memory' was recalled, not "
        "looked up. D = 1, pressure 1, force 1. A deviation is a share of the "
        "reference, or of 2 %\nof the largest of its kind in the case where that is "
        "more; + is too large in magnitude."
    )


if __name__ == "__main__":
    sys.exit(main())
