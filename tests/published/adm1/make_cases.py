#!/usr/bin/env python3
"""Writes the case file of each reference network: NAME.net.json -> NAME.case.json (and the load
record NAME.load.csv where the network has one). Run in this folder after changing a network."""
import ast
import json
import pathlib

HERE = pathlib.Path(__file__).parent
TOLERANCE = {"d1": 1e-9, "d2": 1e-9}
RECORD_EVERY = {"d1": "0.1 d", "d2": "0.001 d"}


def constants():
    """The sets of published values in reference.py, without running it (it needs SciPy)."""
    found = {}
    for node in ast.parse((HERE / "reference.py").read_text()).body:
        if isinstance(node, ast.Assign) and isinstance(node.targets[0], ast.Name):
            name = node.targets[0].id
            if name.startswith("BSM2"):  # dict(...)
                found[name] = {k.arg: ast.literal_eval(k.value) for k in node.value.keywords}
    return found


BSM2 = constants()
LIQUID = [k for k in BSM2["BSM2_INFLUENT"]]


def place(number):
    return {-1: "sludge", -2: "out"}.get(number, "z%d" % number)


def case(name, net):
    influent = net["influent"]
    influent = BSM2["BSM2_INFLUENT"] if influent == "bsm2" else influent
    feed = {"flow": "%r m3/d" % sum(q for a, b, q in net["flows"] if a == -1), "state": influent}
    run = {"kind": net["mode"], "start": "seeded"}
    if net["mode"] == "dynamic":
        run = {"kind": "dynamic", "start": "steady", "until": "%r d" % net["t_end"],
               "record_every": RECORD_EVERY[name], "tolerance": TOLERANCE[name]}
    if "init_gas" in net:
        state = {k: BSM2["BSM2_STEADY"][k] for k in LIQUID}
        state.update({k: influent[k] for k in ("S_cat", "S_an")})
        run["start"] = {place(z): state for z in range(len(net["volumes"]))}
        run["start"]["dome"] = net["init_gas"]
    if "schedule" in net:
        rows = ["day,load", "0,1"] + ["%r,%r" % (e["t"], e["load"]) for e in net["schedule"]]
        (HERE / (name + ".load.csv")).write_text("\n".join(rows) + "\n")
        feed["load"] = {"csv": name + ".load.csv", "time": {"column": "day", "unit": "d"},
                        "value": {"column": "load"}}
    return {
        "stillzone": "case/1",
        "title": "ADM1 reference network " + name,
        "kinetics": "adm1",
        "temperature": "35 degC",
        "zones": {place(z): {"volume": "%r m3" % v, "gas": {"to": "dome", "kLa": "%r 1/d" % kla}}
                  for z, (v, kla) in enumerate(zip(net["volumes"], net["kla"]))},
        "headspaces": {"dome": {"volume": "%r m3" % net.get("V_gas", 300.0),
                                "pipe": {"coefficient": "5e4 m3/d/bar",
                                         "back_pressure": "1.013 bar"}}},
        "feeds": {"sludge": feed},
        "outlets": ["out"],
        "flows": [{"from": place(a), "to": place(b), "flow": "%r m3/d" % q}
                  for a, b, q in net["flows"]],
        "run": run,
    }


for path in sorted(HERE.glob("*.net.json")):
    name = path.name.split(".")[0]
    text = json.dumps(case(name, json.loads(path.read_text())), indent=1)
    (HERE / (name + ".case.json")).write_text(text + "\n")
