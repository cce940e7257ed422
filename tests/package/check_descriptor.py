"""Holds a Data Package descriptor against the files it lists.

    python3 check_descriptor.py datapackage.json

Every resource lies below the descriptor and has the length and the hash it is said to
have; names are unique; and what the report lists as an output is a resource.
"""

import hashlib
import json
import sys
from pathlib import Path, PurePosixPath


def main(descriptor):
    package = json.loads(descriptor.read_text(encoding="utf-8"))
    resources = package["resources"]
    names = {resource["name"] for resource in resources}
    assert len(names) == len(resources), "a name is used twice"
    for resource in resources:
        path = PurePosixPath(resource["path"])
        assert not path.is_absolute() and ".." not in path.parts, path
        content = (descriptor.parent / path).read_bytes()
        assert len(content) == resource["bytes"], path
        assert "sha256:" + hashlib.sha256(content).hexdigest() == resource["hash"], path

    paths = {resource["path"] for resource in resources}
    (report,) = [path for path in paths if path.endswith("bandproof-report.json")]
    recordings = json.loads((descriptor.parent / report).read_text(encoding="utf-8"))["recordings"]
    outputs = {PurePosixPath(report).parent / entry["output"]["path"] for entry in recordings if entry["output"]}
    assert outputs, "a run without outputs proves nothing"
    missing = {str(path) for path in outputs} - paths
    assert not missing, missing
    print(f"{descriptor}: {len(resources)} resources, all as described")


if __name__ == "__main__":
    main(Path(sys.argv[1]))
