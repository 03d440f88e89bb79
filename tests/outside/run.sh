#!/usr/bin/env bash
# Holds the built program against readers that others wrote: scipy for BVH, the three loader for glTF, and the
# Khronos validator for every .glb written. usage: tests/outside/run.sh PROGRAM   (from the crate's root)
set -euo pipefail
program=$(realpath "$1")
data=../shared/data
if [ ! -d "$data" ]; then
    echo "skipped: no real clips at $data"
    [ -z "${CI:-}" ]
    exit
fi
python=target/outside/venv/bin/python
out=target/outside/written
rm -rf "$out" && mkdir -p "$out"

echo "-- BVH as scipy plays it"
"$python" tests/outside/bvh_check.py "$program" "$data"/bvh/*.bvh

echo "-- glTF as the three loader plays it"
node tests/outside/gltf_check.mjs "$program" "$data"/gltf/*.gl* "$data"/gltf/assetgen/*.gltf

# Written by the test suite from paths, spacings and meant turns.
paths=(target/tmp/path-export/*.glb)
if [ -e "${paths[0]}" ]; then
    echo "-- curves of our own as the three loader plays them"
    node tests/outside/gltf_check.mjs "$program" "${paths[@]}"
    for file in "${paths[@]}"; do node tests/outside/validate.mjs "$file"; done
fi

# Written by the test suite: many clips and skins in every encoding, smooth and held keys below an uneven size.
odd=(target/tmp/odd/*.gltf)
if [ -e "${odd[0]}" ]; then
    echo "-- odd files as the three loader plays them, as they are and mended"
    for file in "${odd[@]}"; do
        written=$out/odd_$(basename "${file%.gltf}").glb
        "$program" mend "$file" -o "$written" >"$written.log" 2>&1 || { cat "$written.log"; exit 1; }
        node tests/outside/validate.mjs "$file" "$written"
        node tests/outside/gltf_check.mjs "$program" "$file" "$written"
    done
fi

echo "-- blends as scipy works them out"
"$python" tests/outside/blend_check.py "$program" "$data"/bvh/cmu_02_01_walk.bvh "$data"/bvh/cmu_05_06_dance.bvh

# Written by the test suite from real pairs.
exported=(target/tmp/blend-export/*.json)
if [ -e "${exported[0]}" ]; then
    echo "-- alignment as scipy's minimiser and a plain table find it"
    "$python" tests/outside/alignment_check.py "${exported[@]}"
fi

echo "-- every file mended and written; what is written reads back and is valid"
for file in "$data"/gltf/*.gl* "$data"/gltf/assetgen/*.gltf; do
    name=$(basename "$file")
    # A skin without an animation: told as an error, nothing is written.
    [ "$name" = Animation_Skin_03.gltf ] && continue
    "$program" mend "$file" -o "$out/${name%.*}.glb" >"$out/$name.log" 2>&1 || { cat "$out/$name.log"; exit 1; }
    node tests/outside/validate.mjs "$file" "$out/${name%.*}.glb"
done
for file in "$data"/bvh/*.bvh; do
    name=$(basename "$file" .bvh)
    "$program" mend "$file" -o "$out/$name.bvh" >"$out/$name.log" 2>&1 || { cat "$out/$name.log"; exit 1; }
    "$program" convert "$out/$name.bvh" -o "$out/$name.from_bvh.glb" >>"$out/$name.log" 2>&1 || { cat "$out/$name.log"; exit 1; }
    node tests/outside/validate.mjs "$out/$name.from_bvh.glb"
done
for file in "$data"/csv/humanoid3d_*.csv "$data"/csv/imu_a_quaternion_wxyz.csv "$data"/csv/walk01_rot.csv; do
    name=$(basename "$file" .csv)
    "$program" mend "$file" -o "$out/$name.csv" >"$out/$name.log" 2>&1 || { cat "$out/$name.log"; exit 1; }
    "$program" convert "$out/$name.csv" -o "$out/$name.from_csv.glb" >>"$out/$name.log" 2>&1 || { cat "$out/$name.log"; exit 1; }
    node tests/outside/validate.mjs "$out/$name.from_csv.glb"
done
echo "-- what was written plays for outsiders as it does for us"
"$python" tests/outside/bvh_check.py "$program" "$out"/*.bvh
node tests/outside/gltf_check.mjs "$program" "$out"/*.glb
