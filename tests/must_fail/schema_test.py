"""The shipped JSON Schema accepts every case and refuses each bad file whose fault a schema can express (schema_refuses.txt)."""
import json
import pathlib
import sys

import jsonschema

root = pathlib.Path(sys.argv[1])
schema = json.loads((root / "io/schema/case.schema.json").read_text())
jsonschema.Draft202012Validator.check_schema(schema)
validator = jsonschema.Draft202012Validator(schema)
wrong = []
cases = sorted(root.glob("cases/**/*.json")) + sorted(root.glob("tests/published/cases/*.json"))
for path in cases:
    for error in validator.iter_errors(json.loads(path.read_text())):
        wrong.append(f"{path}: refused: {error.json_path}: {error.message[:200]}")
names = (root / "tests/must_fail/schema_refuses.txt").read_text().split()
for name in names:
    if validator.is_valid(json.loads((root / f"tests/must_fail/{name}.json").read_text())):
        wrong.append(f"{name}: accepted, but a schema can express its fault")
print("\n".join(wrong) or f"{len(cases)} cases accepted, {len(names)} bad files refused")
sys.exit(1 if wrong or len(cases) < 10 or len(names) < 50 else 0)
