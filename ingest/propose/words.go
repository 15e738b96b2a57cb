package propose

import (
	"slices"
	"strings"
	"unicode"

	"thawledger/pipeline"
)

// Words that column names are made of. A name that is none of them is cut into
// them if that goes without a rest: airtempmax, tmin.
var (
	tempWords = []string{"temp", "temps", "temperature", "temperatures", "tmp", "t", "ta", "tair", "airt"}
	meanWords = []string{"mean", "avg", "ave", "average", "tg"}
	maxWords  = []string{"max", "maximum", "high", "highest", "mx", "tx"}
	minWords  = []string{"min", "minimum", "low", "lowest", "mn", "tn"}
	cWords    = []string{"c", "degc", "celsius", "celcius", "centigrade", "°c", "℃"}
	fWords    = []string{"f", "degf", "fahrenheit", "°f", "℉"}
	kWords    = []string{"k", "kelvin", "degk"}

	// otherWords are of what is no air temperature, though some are temperatures.
	otherWords = []string{
		"dew", "dewpoint", "dewpt", "dp", "td", "tdew", "wet", "bulb", "wetbulb", "tw", "wind", "chill", "windchill", "heat", "cool", "index", "humidex", "hmdx",
		"feels", "apparent", "soil", "ground", "surface", "surf", "sur", "skin", "sea", "water", "sst", "ice", "snow", "permafrost", "borehole", "thermistor", "depth",
		"normal", "normals", "departure", "anomaly", "deg-days", "days", "flag", "quality", "qc", "qual", "rh", "hum", "humidity", "precip", "prcp", "precipitation",
		"rain", "rainfall", "pressure", "press", "baro", "panel", "battery", "batt", "logger", "ptemp", "dir", "direction", "speed", "spd", "gust", "std", "sd",
		"stdev", "sigma", "count", "samples", "n", "rad", "radiation", "solar", "sol", "sun", "moisture", "vapor", "vapour", "cloud", "vis", "visibility", "daylight",
		"season", "elev", "elevation", "altitude", "lat", "latitude", "lon", "lng", "long", "longitude", "record", "year", "month", "day", "hour", "minute", "second",
		"doy", "jday", "julian", "id", "obs", "tobs", "time", "date", "hdd", "cdd", "ghcn", "weather", "code", "type", "vn",
	}
	flagWords = []string{"flag", "flags", "quality", "qc", "qual", "qflag", "qualifier", "status", "remark", "attributes", "attribute", "q", "qa", "mark"}

	pieces = slices.Concat(
		[]string{"temp", "temperature", "tmp", "t", "air", "point", "hourly", "daily", "degree", "deg"}, meanWords, maxWords, minWords, cWords, fWords,
		[]string{"dew", "dewpoint", "wet", "bulb", "wind", "chill", "soil", "ground", "water", "snow", "surface", "flag", "quality", "station", "id", "code"},
	)
)

const maxWord = 24

// wordsOf cuts a column name into words of small letters.
func wordsOf(name string) (words []string) {
	var previous rune
	word := func(r rune) bool { return unicode.IsLetter(r) || r == '°' }
	from := -1
	flush := func(to int) {
		if from >= 0 {
			words = append(words, apart(strings.ToLower(name[from:to]))...)
		}
		from = -1
	}
	for i, r := range name {
		switch {
		case !word(r):
			flush(i)
		case from < 0:
			from = i
		case unicode.IsUpper(r) && unicode.IsLower(previous):
			flush(i)
			from = i
		}
		previous = r
	}
	flush(len(name))
	return words
}

// apart cuts a word into pieces, if it is made of nothing else.
func apart(word string) []string {
	if len(word) > maxWord || slices.Contains(otherWords, word) || slices.Contains(tempWords, word) || slices.Contains(pieces, word) {
		return []string{word}
	}
	// made[i] is the longest first piece of a cut of word[i:]; "" if there is none.
	made := make([]string, len(word)+1)
	for i := len(word) - 1; i >= 0; i-- {
		for _, p := range pieces {
			end := i + len(p)
			if len(p) > len(made[i]) && strings.HasPrefix(word[i:], p) && (end == len(word) || made[end] != "") {
				made[i] = p
			}
		}
	}
	if made[0] == "" {
		return []string{word}
	}
	var out []string
	for i := 0; i < len(word); i += len(made[i]) {
		out = append(out, made[i])
	}
	if !slices.Contains(out, "t") && !slices.ContainsFunc(out, func(p string) bool { return len(p) > 2 }) {
		return []string{word} // letters that fit by chance
	}
	return out
}

// statedUnit returns the unit that a column's name, or its line of units, gives.
func (c *column) statedUnit() (pipeline.TempUnit, bool) {
	words := slices.Concat(c.words, wordsOf(c.unit))
	var found []pipeline.TempUnit
	for _, u := range []struct {
		unit  pipeline.TempUnit
		words []string
	}{{pipeline.DegC, cWords}, {pipeline.DegF, fWords}, {pipeline.Kelvin, kWords}} {
		if slices.ContainsFunc(u.words, func(w string) bool { return slices.Contains(words, w) }) {
			found = append(found, u.unit)
		}
	}
	if len(found) != 1 || slices.Contains(words, "tenths") || strings.Contains(c.name+c.unit, "0.1") {
		return "", false // none, or several, or in parts of it
	}
	return found[0], true
}
