#!/usr/bin/env bash
# Writes the files that README.md shows into a folder: scripts/from-readme.sh FOLDER
#
# A shown file is a fenced block right below a line that ends with its name in backticks and a colon.
set -euo pipefail
folder=${1:?the folder to write to}
mkdir -p "$folder"
awk -v folder="$folder" '
    /^```/ && open { close(file); open = 0; next }
    open { print > file; next }
    /^```/ { if (name != "") { file = folder "/" name; open = 1; print file } else { open = skip = !skip } ; name = ""; next }
    /^$/ { next }
    { name = match($0, /`[^`]+`:$/) ? substr($0, RSTART + 1, RLENGTH - 3) : "" }
' "$(dirname "$0")/../README.md"
