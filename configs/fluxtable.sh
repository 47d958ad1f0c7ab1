#!/bin/sh
# Makes a table of circular fluxes that can drive an inspiral (orbit.drive):
#
#   configs/fluxtable.sh TABLE.csv [INNERMOST OUTERMOST COUNT [OPTIONS FOR EVERY RUN]]
#
# One plain run of circular.yaml a radius, evenly spaced in 1/r; the sums over
# all modes, with the estimated rest in l, are the rows. Runs that are there
# already are not run again. NULLMARK names the program, RUNS the directory of
# the runs.
set -eu
table=${1:?name the table to write}
inner=${2:-5}
outer=${3:-12}
count=${4:-30}
shift $(($# < 4 ? $# : 4))
program=${NULLMARK:-nullmark}
runs=${RUNS:-results/fluxtable}
base=$(dirname "$0")/circular.yaml
mkdir -p "$runs"

radii=$(awk -v a="$inner" -v b="$outer" -v n="$count" \
	'BEGIN { for (i = 0; i < n; i++) printf "%.12g\n", 1 / (1 / b + i * (1 / a - 1 / b) / (n - 1)) }')
for r in $radii; do
	out=$runs/r$r
	if [ ! -f "$out/SHA256SUMS" ]; then
		code=0
		"$program" run "$base" --quiet --out "$out" --set "orbit.radius=$r" --set output.keep='[flux]' "$@" >&2 || code=$?
		[ "$code" -le 1 ] || exit "$code" # 1: done, but one of the bars is wider than asked
	fi
done
{
	echo "# circular orbits on Schwarzschild, sums over all modes with the estimated rest in l; (mu/M)^2, absolute bars; made by fluxtable.sh TABLE $inner $outer $count $*"
	echo "orbit.radius,energy_infinity,energy_infinity_error,energy_horizon,energy_horizon_error"
	for r in $radii; do
		awk -F, -v r="$r" '
			/^#/ { next }
			!names { for (i = 1; i <= NF; i++) at[$i] = i; names = 1; next }
			$at["row"] == "sum" {
				print r "," $at["energy_infinity"] "," $at["energy_infinity_error"] "," $at["energy_horizon"] "," $at["energy_horizon_error"]
			}' "$runs/r$r/flux.csv"
	done
} >"$table.new"
mv "$table.new" "$table"
