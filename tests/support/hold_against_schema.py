#!/usr/bin/python3
# SPDX-License-Identifier: GPL-3.0-or-later
"""hold_against_schema.py SCHEMA RESULT...: every result keeps to the schema, or the reasons are printed."""
import json
import sys

import jsonschema


def no_constants(name):
    raise ValueError(f"{name} is no JSON")


def main():
    with open(sys.argv[1], encoding="utf-8") as file:
        schema = json.load(file)
    validator_class = jsonschema.validators.validator_for(schema)
    validator_class.check_schema(schema)
    validator = validator_class(schema)
    broken = 0
    for name in sys.argv[2:]:
        with open(name, encoding="utf-8") as file:
            result = json.load(file, parse_constant=no_constants)
        for problem in validator.iter_errors(result):
            broken = 1
            print(f"{name}: /{'/'.join(map(str, problem.absolute_path))}: {problem.message[:500]}")
            for reason in problem.context:
                print(f"  {reason.message[:500]}")
    sys.exit(broken)


if __name__ == "__main__":
    main()
