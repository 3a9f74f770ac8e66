#!/usr/bin/env bash
# A folder of wheels from which the service installs on a machine without a network. Run it on a machine with one, with the
# same version of Python and the same kind of processor:
#
#   docker/wheelhouse.sh wheelhouse
#
# and there: pip install --no-index --find-links wheelhouse --require-hashes -r wheelhouse/requirements.txt
#            pip install --no-index --find-links wheelhouse gasapi
set -euo pipefail
target=$(realpath -m "${1:?name the folder}")
cd "$(dirname "$0")/.."
mkdir -p "$target"
tools=$(mktemp -d)
trap 'rm -rf "$tools"' EXIT
python3 -m venv "$tools/venv"
pip="$tools/venv/bin/pip"
"$pip" install -q --require-hashes --only-binary :all: -r docker/requirements-build.txt
"$pip" download -q --require-hashes --only-binary :all: --dest "$target" -r docker/requirements.txt
# built from a copy, so that no build folder stays in the source tree
mkdir "$tools/source"
cp -r pyproject.toml README.md openapi gasapi "$tools/source"
"$pip" wheel -q --no-deps --no-build-isolation --wheel-dir "$target" "$tools/source"
cp docker/requirements.txt "$target/requirements.txt"
(cd "$target" && sha256sum -- *.whl >SHA256SUMS)
