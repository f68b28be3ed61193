#!/usr/bin/env python3
"""The floors of the house: core <- kinetics <- network <- cli. Includes point left only.

Usage: include_rule_test.py SOURCE_DIR. Prints every include that points the wrong way, and every
third-party header outside the one place that may use it. With --self-test: proves that it notices.
"""
import pathlib
import re
import sys

ALLOWED = {
    "core": {"core"},
    "kinetics": {"core", "kinetics"},
    "network": {"core", "kinetics", "network"},
    "cli": {"core", "kinetics", "network", "cli"},
}
# A third-party header may be included only below these paths.
ONLY_IN = {
    r"(ida|idas|nvector|sunmatrix|sunlinsol|sundials)/": ["core/dae/"],
    r"klu\.h": ["core/dae/"],
    r"udunits2\.h": ["core/units"],
    r"ceres/": ["core/"],
    r"boost/graph/": ["network/"],
    r"netcdf\.h": ["cli/"],
    r"graphviz/": ["cli/report/"],
    r"CLI/": ["cli/"],
    r"spdlog/": ["cli/"],
}
# These draw or compute without knowing what lives in a zone: they may not include kinetics.
NO_KINETICS = ["network/zone_graph", "network/tracer/"]
INCLUDE = re.compile(r'^\s*#\s*include\s*([<"])([^">]+)[">]')


def faults_of(path, text):
    floor = path.split("/")[0]
    for number, line in enumerate(text.splitlines(), 1):
        match = INCLUDE.match(line)
        if not match:
            continue
        kind, name = match.groups()
        target = name.split("/")[0]
        if target in ALLOWED and target not in ALLOWED[floor]:
            yield f"{path}:{number}: {floor} must not include {name}"
        if kind == '"' and target not in ALLOWED:
            yield f"{path}:{number}: include by path from the root: {name}"
        if target == "kinetics" and any(path.startswith(p) for p in NO_KINETICS):
            yield f"{path}:{number}: this part knows no kinetics: {name}"
        for pattern, places in ONLY_IN.items():
            if re.match(pattern, name) and not any(path.startswith(p) for p in places):
                yield f"{path}:{number}: {name} belongs in {', '.join(places)} only"
        if path.endswith(".hpp") and name == "iostream":
            yield f"{path}:{number}: no <iostream> in headers"
    if re.search(r"^\s*using namespace", text, re.M) and path.endswith(".hpp"):
        yield f"{path}: no using namespace in headers"
    text = re.sub(r"//[^\n]*", "", text)
    if floor in ("core", "network") and re.search(r'"[SX]_[a-z]{2,3}\d?"', text):
        yield f"{path}: no component name stands in core or network source"
    if floor != "cli" and re.search(r"\b(std::(cout|cerr|getenv|exit|abort)|printf)\b", text):
        yield f"{path}: core, kinetics and network never print, exit or read the environment"


def self_test():
    bad = {
        "core/a.hpp": '#include "network/case.hpp"\n',
        "kinetics/a.cpp": '#include "cli/program.hpp"\n',
        "network/a.cpp": "#include <idas/idas.h>\n",
        "network/b.cpp": 'x = "S_ac";\n',
        "network/zone_graph.cpp": '#include "kinetics/kinetic_model.hpp"\n',
        "core/b.cpp": 'std::cout << 1;\n',
        "core/c.hpp": "#include <iostream>\n",
    }
    for path, text in bad.items():
        if not list(faults_of(path, text)):
            sys.exit(f"the rule does not notice: {path}: {text}")
    if list(faults_of("network/a.cpp", '#include "core/fault.hpp"\n#include <vector>\n')):
        sys.exit("the rule complains about a right file")


def main():
    root = pathlib.Path(sys.argv[1])
    self_test()
    found = []
    n_files = 0
    for floor in ALLOWED:
        for path in sorted((root / floor).rglob("*.[ch]pp")):
            n_files += 1
            found += faults_of(path.relative_to(root).as_posix(), path.read_text())
    print("\n".join(found))
    if n_files < 20:
        sys.exit(f"only {n_files} files seen: is {root} the source folder?")
    sys.exit(1 if found else 0)


if __name__ == "__main__":
    main()
