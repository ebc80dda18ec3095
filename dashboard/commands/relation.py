"""leewater relation: one-dimensional and screening relations as side calculations."""

from __future__ import annotations

import argparse

from . import write_json

HELP = "a published one-dimensional or screening relation, reckoned beside the model"


def arguments(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("name", nargs="?", metavar="NAME", help="the relation (without one: the list)")
    parser.add_argument("given", nargs="*", metavar="ARGUMENT=VALUE", help="its arguments in SI units; without any: what it takes")
    parser.add_argument("--json", metavar="FILE", help="write the answer as JSON (- for standard output)")


def run(args: argparse.Namespace) -> int:
    from hydro.handbook import RELATIONS, reckon, relation

    if args.name is None:
        for known in RELATIONS.values():
            print(f"{known.name:<18} {known.says}  [{known.source}]")
        return 0
    found = relation(args.name)
    if not args.given:
        _explain(found)
        return 0
    given = {}
    for text in args.given:
        name, equals, value = text.partition("=")
        if not equals:
            raise ValueError(f"{text!r} is no ARGUMENT=VALUE; {found.name} takes {', '.join(found.arguments)}.")
        given[name] = value
    result = reckon(found, given)
    if not write_json(args.json, _content(found, given, result)):
        _print(found, result)
    return 0


def _explain(found) -> None:
    import inspect

    print(f"{found.name}: {found.says}  [{found.source}]")
    for name, default in found.arguments.items():
        print(f"  {name}{'' if default is inspect.Parameter.empty else f' (otherwise {default})'}")


def _content(found, given, result) -> dict:
    from hydro.cautions import told

    return {
        "schema": "leewater/relation/1", "relation": found.name, "says": found.says, "source": found.source, "given": given,
        "result": result, "unit": found.unit, "cautions": told(found.cautions),
    }


def _print(found, result) -> None:
    from hydro.cautions import caution
    from hydro.figure import printed

    for name, value in result.items():
        shown = printed(value, digits=4) if isinstance(value, float) else "; ".join(map(str, value)) if isinstance(value, tuple) else value
        if shown != "" and name != "cautions":
            print(f"{name.replace('_', ' ')}: {shown}")
    print(f"  {found.says}  [{found.source}]")
    for id_ in found.cautions:
        print(f"  {caution(id_).text}")
