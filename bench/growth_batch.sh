#!/bin/sh
# Writes a growth-curve batch of 1,000 invented sightlines (Na I pair, Ca II pair,
# four Fe II lines) into a folder, runs it, and tells time and peak memory.
# Usage: bench/growth_batch.sh path/to/lacuna [folder]
set -eu
lacuna=$1
dir=${2:-$(mktemp -d)}
mkdir -p "$dir"
awk 'BEGIN {
	srand(7)
	print "sightline,line,W_mA,W_err_mA"
	for (i = 1; i <= 1000; i++) {
		s = 0.4 + 1.2 * rand()
		printf "Lantern %04d,Na I 5889.95,%.2f,%.2f\nLantern %04d,Na I 5895.92,%.2f,%.2f\n", i, 120*s, 2.5, i, 90*s, 2.5
		printf "Lantern %04d,Ca II 3933.66,%.2f,%.2f\nLantern %04d,Ca II 3968.47,%.2f,%.2f\n", i, 75*s, 3, i, 45*s, 3
		printf "Lantern %04d,Fe II 2249.88,%.2f,%.2f\nLantern %04d,Fe II 2260.78,%.2f,%.2f\n", i, 15*s, 2, i, 20*s, 2
		printf "Lantern %04d,Fe II 2374.46,%.2f,%.2f\nLantern %04d,Fe II 2344.21,%.2f,%.2f\n", i, 120*s, 3, i, 170*s, 3
	}
}' >"$dir/widths.csv"
printf '[growth]\nname = "a thousand sightlines"\ntable = "widths.csv"\n' >"$dir/batch.toml"
/usr/bin/time -f '%e s, %M kB peak' "$lacuna" growth "$dir/batch.toml" --out "$dir/out" --no-figures >/dev/null
