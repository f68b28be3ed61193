#!/usr/bin/env python3
"""The built program as its users meet it: output, messages, exit codes, files left behind.

Usage: program_test.py PROGRAM SOURCE_DIR [unittest arguments]
"""
import json
import os
import pathlib
import subprocess
import sys
import tempfile
import unittest

PROGRAM = pathlib.Path(sys.argv[1]).resolve()
SOURCE = pathlib.Path(sys.argv[2]).resolve()
CASES = SOURCE / "cases"
BROKEN = SOURCE / "tests" / "program" / "broken"


def run(*arguments, cwd=None):
    return subprocess.run([str(PROGRAM), *map(str, arguments)], cwd=cwd, capture_output=True,
                          text=True, timeout=240)


class InFolder(unittest.TestCase):
    """Each test has an empty folder of its own to work in."""

    def setUp(self):
        self._folder = tempfile.TemporaryDirectory()
        self.addCleanup(self._folder.cleanup)
        self.folder = pathlib.Path(self._folder.name)

    def left_behind(self):
        return sorted(p.name for p in self.folder.iterdir())


class BrokenFiles(InFolder):
    """Every wrong file: its exact messages, exit code 1, nothing left behind."""

    def check_folder(self, kind, command):
        files = sorted((BROKEN / kind).glob("*.json"))
        for path in files:
            with self.subTest(path.name):
                done = subprocess.run([str(PROGRAM), command, path.name], cwd=path.parent,
                                      capture_output=True, text=True, timeout=60)
                self.assertEqual(done.returncode, 1, done.stderr)
                self.assertEqual(done.stdout, "")
                self.assertEqual(done.stderr, path.with_suffix(".expected").read_text())
                self.assertFalse((path.parent / (path.stem + ".out")).exists())
        return len(files)

    def test_cases(self):
        self.check_folder("cases", "run")

    def test_models(self):
        self.check_folder("models", "model")

    def test_tests(self):
        self.assertGreaterEqual(self.check_folder("tests", "tracer"), 30)

    def test_plans(self):
        self.assertGreaterEqual(self.check_folder("plans", "plan"), 6)

    def test_there_are_at_least_40(self):
        self.assertGreaterEqual(len(list(BROKEN.glob("*/*.json"))), 40)


class WrongCommandLines(InFolder):
    def check(self, arguments, message):
        done = run(*arguments, cwd=self.folder)
        self.assertEqual(done.returncode, 2, done.stderr)
        self.assertEqual(done.stdout, "")
        self.assertIn(message, done.stderr)
        self.assertEqual(self.left_behind(), [])

    def test_mistyped_command(self):
        self.check(["chek", "x.json"], '"chek" is no command. Did you mean "check"?')

    def test_mistyped_flag(self):
        self.check(["run", "x.json", "--ouput", "y"],
                   'flag "--ouput" is not known here. Did you mean "--out"?')

    def test_flag_of_another_command(self):
        self.check(["model", "adm1", "--set", "/a=1"], 'flag "--set" is not known here.')

    def test_missing_input(self):
        self.check(["run"], "stillzone run: no CASE was given.")

    def test_too_many_inputs(self):
        self.check(["check", "a.json", "b.json"], '"b.json" is one argument too many')

    def test_nothing_at_all(self):
        done = run(cwd=self.folder)
        self.assertEqual(done.returncode, 2)
        self.assertIn("Usage: stillzone COMMAND", done.stderr)

    def test_setting_without_pointer(self):
        self.check(["run", "x.json", "--set", "run/until=3 d"], 'is not "/json/pointer=value"')

    def test_flags_that_come_later(self):
        self.check(["run", "x.json", "--samples", "3"], 'flag "--samples" is not in this version yet')

    def test_unknown_schema(self):
        self.check(["schema", "cases"], 'there is no schema "cases". Did you mean "case"?')


class Help(InFolder):
    def test_every_command_has_an_example(self):
        overview = run("help").stdout
        for command in ("check", "run", "washout", "model", "schema"):
            self.assertIn("\n  " + command + " ", overview)
            done = run("help", command)
            self.assertEqual(done.returncode, 0)
            self.assertIn("Example:\n  stillzone " + command, done.stdout)
            self.assertEqual(run(command, "--help").stdout, done.stdout)

    def test_version(self):
        done = run("--version")
        self.assertEqual((done.returncode, done.stderr), (0, ""))
        self.assertRegex(done.stdout, r"^stillzone \d+\.\d+\.\d+\n$")


class Washout(InFolder):
    def test_writes_its_files_and_says_where(self):
        done = run("washout", CASES / "near_washout.json", cwd=self.folder)
        self.assertEqual(done.returncode, 0, done.stderr)
        self.assertEqual(self.left_behind(), ["near_washout.out"])
        files = sorted(p.name for p in (self.folder / "near_washout.out").iterdir()
                       if not p.name.startswith("."))
        self.assertEqual(files, ["curve.csv", "report.html", "summary.json"])
        self.assertIn("Written to near_washout.out", done.stdout)
        page = (self.folder / "near_washout.out" / "report.html").read_text()
        for word in ("Load curves", "Early warning", "Who can live where", "Cautions", "Provenance"):
            self.assertIn(word, page)

    def test_wrong_case_leaves_nothing(self):
        done = run("washout", CASES / "near_washout.json", "--set", "/zones/main/volume=-3 m3",
                   cwd=self.folder)
        self.assertEqual(done.returncode, 1)
        self.assertIn("/zones/main/volume", done.stderr)
        self.assertEqual(self.left_behind(), [])

    def test_summary_holds_the_promised_keys(self):
        done = run("washout", CASES / "near_washout.json", "--json", cwd=self.folder)
        summary = json.loads(done.stdout)
        for key in ("network_washout_rate_1_d", "ideal_washout_rate_1_d", "groups",
                    "critical_load", "ideal_critical_load", "first_to_fail", "curve",
                    "ideal_curve"):
            self.assertIn(key, summary)
        for point in summary["curve"]:
            for key in ("load", "hrt_d", "methane_flow_m3_d", "vfa", "pH", "stable"):
                self.assertIn(key, point)
        self.assertLess(summary["critical_load"], 1)
        self.assertGreater(summary["ideal_critical_load"], 1)


class Files(InFolder):
    def test_missing_and_folder(self):
        done = run("check", "nothing.json", cwd=self.folder)
        self.assertEqual(done.returncode, 1)
        self.assertEqual(done.stderr,
                         "nothing.json: there is no such file; an input file must exist. "
                         "Check the name and the folder you are in.\n")
        done = run("check", str(self.folder))
        self.assertEqual(done.returncode, 1)
        self.assertIn("this is a folder; an input file is needed.", done.stderr)

    def test_output_is_replaced_only_when_it_is_ours(self):
        case = CASES / "ideal_tank.json"
        for _ in range(2):
            done = run("run", case, "--out", "here.out", cwd=self.folder)
            self.assertEqual(done.returncode, 0, done.stderr)
        self.assertEqual(self.left_behind(), ["here.out"])
        (self.folder / "mine").mkdir()
        (self.folder / "mine" / "thesis.txt").write_text("precious")
        done = run("run", case, "--out", "mine", cwd=self.folder)
        self.assertEqual(done.returncode, 1)
        self.assertIn("mine exists and was not written by stillzone.", done.stderr)
        self.assertEqual((self.folder / "mine" / "thesis.txt").read_text(), "precious")
        done = run("run", case, "--out", "no/such/folder", cwd=self.folder)
        self.assertEqual(done.returncode, 1)
        self.assertIn("does not exist", done.stderr)
        self.assertEqual(self.left_behind(), ["here.out", "mine"])


class Settings(InFolder):
    def test_set_changes_a_value(self):
        done = run("check", CASES / "ideal_tank.json", "--set", "/title=Renamed")
        self.assertEqual(done.returncode, 0, done.stderr)
        self.assertIn("Renamed", done.stdout)

    def test_set_complains(self):
        done = run("check", CASES / "ideal_tank.json", "--set", "/zone/volume=1 m3")
        self.assertEqual(done.returncode, 1)
        self.assertIn('no "zone" in "/"', done.stderr)
        self.assertIn('Did you mean "zones"?', done.stderr)


class Log(InFolder):
    def test_debug_lines_go_to_stderr_and_quiet_silences_them(self):
        case = CASES / "ideal_tank.json"
        done = run("run", case, "--json", "--log-level", "debug", cwd=self.folder)
        self.assertIn("debug: ", done.stderr)
        json.loads(done.stdout)
        done = run("run", case, "--json", "--log-level", "debug", "--quiet", cwd=self.folder)
        self.assertEqual(done.stderr, "")


class Summary(InFolder):
    def test_has_the_keys_of_the_contract(self):
        done = run("run", CASES / "three_zone_example.json", "--json", "--quiet",
                   "--set", "/run/until=2 d", cwd=self.folder)
        self.assertEqual(done.returncode, 0, done.stderr)
        self.assertEqual(done.stderr, "")
        summary = json.loads(done.stdout)
        for key in ("zones", "outlets", "headspaces", "flows", "balances", "solver", "warnings"):
            self.assertIn(key, summary)
        self.assertIn("pH", summary["zones"]["core"]["state"])
        self.assertIn("S_ac", summary["zones"]["rim"]["state"])
        self.assertAlmostEqual(summary["outlets"]["overflow"]["flow_m3_d"], 170.0, places=9)
        dome = summary["headspaces"]["dome"]
        for key in ("pressure_bar", "gas_flow_m3_d", "gas_flow_normal_dry_m3_d",
                    "methane_flow_normal_m3_d"):
            self.assertGreater(dome[key], 0.0)
        self.assertIn("S_gas_ch4", dome["state"])
        for name in ("water", "COD", "C", "N"):
            self.assertLess(abs(summary["balances"][name]), 1e-9, name)
        for key in ("unknowns", "steps", "residual_calls", "jacobian_calls", "seconds"):
            self.assertIn(key, summary["solver"])
        for flow in summary["flows"]:
            self.assertEqual(sorted(flow), ["flow_m3_d", "from", "to"])
        written = json.loads((self.folder / "three_zone_example.out" / "summary.json").read_text())
        self.assertEqual(written, summary)

    def test_a_summary_state_can_be_the_next_start(self):
        done = run("run", CASES / "short_circuit_stagnant.json", "--json", "--quiet",
                   cwd=self.folder)
        first = json.loads(done.stdout)
        start = {name: zone["state"] for name, zone in first["zones"].items()}
        start |= {name: space["state"] for name, space in first["headspaces"].items()}
        done = run("run", CASES / "short_circuit_stagnant.json", "--json", "--quiet", "--set",
                   "/run/start=" + json.dumps(start), cwd=self.folder)
        self.assertEqual(done.returncode, 0, done.stderr)
        again = json.loads(done.stdout)
        for name, zone in first["zones"].items():
            for key, value in zone["state"].items():
                self.assertAlmostEqual(again["zones"][name]["state"][key], value, delta=1e-9)

    def test_means_of_a_dynamic_run(self):
        done = run("run", CASES / "three_zone_example.json", "--json", "--quiet",
                   "--set", "/run/until=2 d", cwd=self.folder)
        summary = json.loads(done.stdout)
        self.assertGreater(summary["headspaces"]["dome"]["means"]["gas_flow_m3_d"], 0.0)
        self.assertIn("S_ac", summary["zones"]["core"]["means"])
        self.assertIn("means", summary["states_are"])

    def test_warnings_where_a_result_worries(self):
        done = run("run", CASES / "ideal_tank.json", "--json", "--quiet",
                   "--set", "/temperature=20 degC", cwd=self.folder)
        warnings = " ".join(json.loads(done.stdout)["warnings"])
        self.assertIn("is at 20.0 degC; the rates of model", warnings)
        done = run("run", CASES / "ideal_tank.json", "--json", "--quiet",
                   "--set", "/feeds/sludge/flow=1700 m3/d", cwd=self.folder)
        if done.returncode == 0:
            self.assertIn("outside 6.6 to 8.2", " ".join(json.loads(done.stdout)["warnings"]))

    def test_series_has_units_and_starts_at_zero(self):
        done = run("run", CASES / "three_zone_example.json", "--quiet", "--set", "/run/until=1 d",
                   cwd=self.folder)
        self.assertEqual(done.returncode, 0, done.stderr)
        folder = self.folder / "three_zone_example.out"
        lines = (folder / "series.csv").read_text().splitlines()
        header = lines[0].split(",")
        self.assertEqual(header[0], "time_d")
        self.assertIn("core.S_ac [kg COD/m3]", header)
        self.assertEqual(float(lines[1].split(",")[0]), 0.0)
        self.assertEqual(float(lines[-1].split(",")[0]), 1.0)
        try:
            import netCDF4
        except ImportError:
            self.skipTest("python3-netcdf4 is not installed")
        with netCDF4.Dataset(folder / "series.nc") as file:
            self.assertEqual(file.Conventions, "CF-1.8")
            values = file["zone_S_ac"][:]
            column = header.index("core.S_ac [kg COD/m3]")
            self.assertEqual(values[0, 0], float(lines[1].split(",")[column]))
            self.assertEqual(file["zone_S_ac"].units, "kg/m3")
            names = ["".join(c.decode() for c in row if c) for row in file["zone_name"][:].data]
            self.assertEqual(names[0].rstrip("\0"), "core")


class Tracer(InFolder):
    """A tracer test from its CSV to a case that runs."""

    TEST = CASES / "lithium_test.json"

    def test_from_test_to_run(self):
        done = run("tracer", self.TEST, "--emit", "stagnant_exchange", "--out", "found",
                   cwd=self.folder)
        self.assertEqual(done.returncode, 0, done.stderr)
        self.assertEqual(done.stderr, "")
        found = self.folder / "found"
        self.assertEqual(sorted(p.name for p in found.iterdir() if p.suffix in (".json", ".csv", ".html")),
                         ["fits.csv", "report.html", "stagnant_exchange.case.json", "summary.json"])
        summary = json.loads((found / "summary.json").read_text())
        best = summary["models"][0]
        self.assertEqual(best["name"], "stagnant_exchange")
        # What the invented data were made with: 74 % mixed, 0.28 of the flow exchanged, 92 % seen.
        for name, truth in (("mixed_fraction", 0.74), ("exchange_flow", 0.28 * 170.85),
                            ("recovered_fraction", 0.92)):
            parameter = best["parameters"][name]
            self.assertLess(parameter["low"], truth, name)
            self.assertGreater(parameter["high"], truth, name)
            self.assertTrue(parameter["identified"], name)
        self.assertEqual(len(summary["models"]), 8)
        self.assertAlmostEqual(sum(m["weight"] for m in summary["models"]), 1.0)
        case = found / "stagnant_exchange.case.json"
        self.assertEqual(run("check", case, cwd=self.folder).returncode, 0)
        ran = run("run", case, "--json", "--quiet", cwd=self.folder)
        self.assertEqual(ran.returncode, 0, ran.stderr)
        for name, error in json.loads(ran.stdout)["balances"].items():
            self.assertLess(abs(error), 1e-9, name)

    def test_own_network_and_feed_of_a_case(self):
        done = run("tracer", CASES / "lithium_own_network.json", "--emit", "lithium_network.json",
                   "--json", "--out", "own", cwd=self.folder)
        self.assertEqual(done.returncode, 0, done.stderr)
        names = [m["name"] for m in json.loads(done.stdout)["models"]]
        self.assertIn("lithium_network.json", names)
        self.assertEqual(run("check", self.folder / "own" / "lithium_network.case.json",
                             cwd=self.folder).returncode, 0)
        done = run("tracer", self.TEST, "--emit", "1", "--feed", CASES / "ideal_tank.json",
                   "--out", "fed", cwd=self.folder)
        self.assertEqual(done.returncode, 0, done.stderr)
        text = next((self.folder / "fed").glob("*.case.json")).read_text()
        self.assertNotIn("invented", text)

    def test_threads_do_not_change_a_digit(self):
        texts = [run("tracer", self.TEST, "--json", "--out", f"t{n}", "--threads", n,
                     cwd=self.folder).stdout for n in (1, 2)]
        self.assertEqual(texts[0], texts[1])

    def test_mistakes_of_the_command_line(self):
        for arguments, code, message in (
                (["--emit", "9"], 2, 'no such model was fitted; a number from 1 to 8'),
                (["--emit", "one_tnk"], 2, 'Did you mean "one_tank"?'),
                (["--feed", "x.json"], 2, "--feed belongs to --emit"),
                (["--emit", "1", "--feed", "x.json"], 1, "x.json"),
                (["--rule", "simpsn"], 2, 'Did you mean "simpson"?')):
            with self.subTest(" ".join(arguments)):
                done = run("tracer", self.TEST, *arguments, cwd=self.folder)
                self.assertEqual(done.returncode, code, done.stderr)
                self.assertIn(message, done.stderr)
                self.assertEqual(done.stdout, "")
        self.assertEqual(self.left_behind(), [])


class Plan(InFolder):
    """A tracer test designed, and its sheet."""

    def test_plan_of_a_lithium_test(self):
        done = run("plan", CASES / "plan_lithium_test.json", "--json", "--out", "p", cwd=self.folder)
        self.assertEqual(done.returncode, 0, done.stderr)
        plan = json.loads(done.stdout)
        # 100 detection limits of 0.05 g/m3 in 3400 m3.
        self.assertAlmostEqual(plan["mass_kg"], 17.0)
        times = plan["sampling_times_d"]
        self.assertEqual(len(times), 25)
        self.assertTrue(all(b - a > 0.08 for a, b in zip(times, times[1:])))
        self.assertLessEqual(times[-1], 60.0 + 1e-9)
        sheet = (self.folder / "p" / "sampling.csv").read_text().splitlines()
        self.assertEqual(len(sheet), 26)
        for curve in plan["detection"]:
            self.assertLessEqual(curve["power"][0], 0.15, curve["fault"])
            self.assertIsNotNone(curve["smallest_at_80_percent"], curve["fault"])
        again = run("plan", CASES / "plan_lithium_test.json", "--json", "--threads", "1", "--out",
                    "q", cwd=self.folder)
        self.assertEqual(done.stdout, again.stdout)

    def test_a_dose_at_once_does_not_show_a_bypass(self):
        done = run("plan", CASES / "plan_lithium_test.json", "--json", "--set", "/dose/over=0 d",
                   "--out", "p", cwd=self.folder)
        plan = json.loads(done.stdout)
        bypass = [c for c in plan["detection"] if c["fault"] == "bypass"][0]
        self.assertIsNone(bypass["smallest_at_80_percent"])
        self.assertIn("cannot show a bypass", " ".join(plan["warnings"]))


class ShippedCases(InFolder):
    """Every shipped case is valid, and its balances close."""

    def cases(self):
        for path in sorted(CASES.glob("*.json")):
            if '"case/1"' in path.read_text():
                yield path

    def test_check(self):
        for path in self.cases():
            with self.subTest(path.name):
                done = run("check", path, cwd=self.folder)
                self.assertEqual(done.returncode, 0, done.stderr)
                self.assertEqual(done.stderr, "")
        self.assertEqual(self.left_behind(), [])

    def test_run(self):
        for path in self.cases():
            with self.subTest(path.name):
                done = run("run", path, "--json", "--quiet", cwd=self.folder)
                self.assertEqual(done.returncode, 0, done.stderr)
                for name, error in json.loads(done.stdout)["balances"].items():
                    self.assertLess(abs(error), 1e-9, name)
                self.assertTrue((self.folder / (path.stem + ".out") / "report.html").exists())

    def test_schema_accepts_them(self):
        try:
            import jsonschema
        except ImportError:
            self.skipTest("python3-jsonschema is not installed")
        schema = json.loads(run("schema", "case").stdout)
        jsonschema.Draft7Validator.check_schema(schema)
        validator = jsonschema.Draft7Validator(schema)
        for path in self.cases():
            with self.subTest(path.name):
                self.assertEqual(list(validator.iter_errors(without_comments(path.read_text()))), [])
        test_schema = json.loads(run("schema", "test").stdout)
        jsonschema.Draft7Validator.check_schema(test_schema)
        test_validator = jsonschema.Draft7Validator(test_schema)
        tests = [p for p in sorted(CASES.glob("*.json")) if '"test/1"' in p.read_text()]
        self.assertGreater(len(tests), 0)
        for path in tests:
            with self.subTest(path.name):
                self.assertEqual(
                    list(test_validator.iter_errors(without_comments(path.read_text()))), [])
        model_schema = json.loads(run("schema", "model").stdout)
        jsonschema.Draft7Validator.check_schema(model_schema)
        models = jsonschema.Draft7Validator(model_schema)
        for path in sorted((SOURCE / "kinetics" / "models").glob("*.json")):
            with self.subTest(path.name):
                self.assertEqual(list(models.iter_errors(without_comments(path.read_text()))), [])


class Models(InFolder):
    def test_adm1_prints_its_matrix_and_audit(self):
        done = run("model", "adm1")
        self.assertEqual((done.returncode, done.stderr), (0, ""))
        for text in ("S_ac", "k_m_ac", "Audit", "closed"):
            self.assertIn(text, done.stdout)

    def test_unknown_model(self):
        done = run("model", "adm")
        self.assertEqual(done.returncode, 1)
        self.assertIn('Did you mean "adm1"?', done.stderr)


def without_comments(text):
    """JSON with // and /* */ comments -> value."""
    out, i, quoted = [], 0, False
    while i < len(text):
        c = text[i]
        if quoted:
            out.append(c)
            if c == "\\":
                out.append(text[i + 1])
                i += 1
            elif c == '"':
                quoted = False
        elif c == '"':
            quoted = True
            out.append(c)
        elif text.startswith("//", i):
            while i < len(text) and text[i] != "\n":
                i += 1
            continue
        elif text.startswith("/*", i):
            i = text.index("*/", i) + 2
            continue
        else:
            out.append(c)
        i += 1
    return json.loads("".join(out))


if __name__ == "__main__":
    os.environ.pop("NO_COLOR", None)
    unittest.main(argv=[sys.argv[0], *sys.argv[3:]])
