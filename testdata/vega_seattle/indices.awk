# Indices of a season by both definitions, a calculation apart from thawledger's:
#   awk -F, -v first=2012-01-15 -v last=2013-01-14 -v sign=1 -f indices.awk seattle-weather.csv
# sign=1: thaw, sign=-1: freeze. Daily mean: (max + min) / 2. Sum: days above 0
# degC. Curve: the largest rise of the cumulative curve, trough before peak.
$1 >= first && $1 <= last {
	x = sign * ($3 + $4) / 2
	if (x > 0) sum += x
	c += x
	if (c < low) low = c
	if (c - low > curve) curve = c - low
	days++
}
END { printf "days %d sum %.2f curve %.2f\n", days, sum, curve }
