package webhook_test

import (
	"encoding/json"
	"fmt"
	"math"
	"os"
	"reflect"
	"regexp"
	"slices"
	"sort"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"

	"thawledger/alerts/delivery"
)

// What is posted is what the schema says: every field of it is there, of the
// type, form and range that it has, and no field is sent that it lacks.
func TestBodyIsAsTheSchemaSays(t *testing.T) {
	schema := readSchema(t)
	r := receiver(t, nil)
	c := channel(t, settings(t, r))
	samples := delivery.Samples()
	for _, n := range samples {
		if out := c.Deliver(t.Context(), n); !out.Delivered {
			t.Fatalf("%+v", out)
		}
	}
	for i, p := range r.All() {
		var value any
		if err := json.Unmarshal(p.Body, &value); err != nil {
			t.Fatal(err)
		}
		for _, fault := range against(schema, schema, value, samples[i].Key) {
			t.Error(fault)
		}
	}
}

// The check above finds what is wrong, each kind of fault once.
func TestSchemaCheckFindsFaults(t *testing.T) {
	schema := readSchema(t)
	r := receiver(t, nil)
	if out := channel(t, settings(t, r)).Deliver(t.Context(), delivery.Samples()[0]); !out.Delivered {
		t.Fatalf("%+v", out)
	}
	good := string(r.All()[0].Body)
	for name, change := range map[string][2]string{
		"field missing":     {`"direction":"not_above",`, ``},
		"field unknown":     {`"direction":`, `"way":1,"direction":`},
		"type":              {`"days_filled":2`, `"days_filled":"2"`},
		"not whole":         {`"days_filled":2`, `"days_filled":2.5`},
		"null":              {`"confirmed":false`, `"confirmed":null`},
		"value not allowed": {`"to_state":"exceeded"`, `"to_state":"bad"`},
		"form":              {`"day":"2031-08-20"`, `"day":"20 August"`},
		"range":             {`"probability":1`, `"probability":70`},
		"version":           {`"version":1`, `"version":2`},
	} {
		bad := strings.Replace(good, change[0], change[1], 1)
		if bad == good {
			t.Fatalf("%s: %s is not in the body", name, change[0])
		}
		var value any
		if err := json.Unmarshal([]byte(bad), &value); err != nil {
			t.Fatalf("%s: %v", name, err)
		}
		if faults := against(schema, schema, value, ""); len(faults) != 1 {
			t.Errorf("%s: %v", name, faults)
		}
	}
}

// The figures of a notice are in the fields named for them.
func TestBodyHasTheFigures(t *testing.T) {
	r := receiver(t, nil)
	n := delivery.Samples()[3]
	if out := channel(t, settings(t, r)).Deliver(t.Context(), n); !out.Delivered {
		t.Fatalf("%+v", out)
	}
	var got struct {
		Items []map[string]any `json:"items"`
	}
	if err := json.Unmarshal(r.All()[0].Body, &got); err != nil {
		t.Fatal(err)
	}
	want := map[string]any{
		"about": "fellmoor.runway.12.2031", "kind": "update", "site": "fellmoor", "site_name": "Fellmoor airstrip", "surface": "runway", "surface_name": "runway",
		"latitude_deg": 68.21, "longitude_deg": -151.4, "index": "thaw", "season": "2031", "direction": "not_above",
		"from_state": "near", "to_state": "expected", "confirmed": false, "since": nil, "why": "progress", "day": "2031-08-20",
		"index_low_c_days": 1551.2, "index_central_c_days": 1551.2, "index_high_c_days": 1551.2, "share_of_design": 1551.2 / 1700,
		"margin_c_days": 148.8, "margin_days": 13.4,
		"design": map[string]any{"c_days": 1700., "stated": 3060., "unit": "degF.d", "definition": "curve", "of": "surface", "source": "design report of 1985, table 4", "n_factor": 1.7},
		"outlook": map[string]any{"probability": 0.7, "date_10": "2031-08-29", "date_50": "2031-09-02", "date_90": "2031-09-14",
			"season_end_10_c_days": 1664., "season_end_50_c_days": 1738., "season_end_90_c_days": 1821., "past_seasons": 30.},
		"rank":              map[string]any{"place": 4., "of": 31.},
		"newest_reading_at": "2031-08-21T12:00:00Z", "days_filled": 0., "days_missing": 0., "last_visit": "2031-06-03",
		"record_provisional": true, "onset_provisional": false, "instruction": "", "exceedance": 41.,
		"earlier_keys": []any{"n-31-0808-1"}, "cautions": []any{},
	}
	if diff := cmp.Diff([]map[string]any{want}, got.Items); diff != "" {
		t.Errorf("(-want +got)\n%s", diff)
	}
}

func TestSameBodyAtEveryAttempt(t *testing.T) {
	r := receiver(t, nil)
	c := channel(t, settings(t, r))
	for range 2 {
		if out := c.Deliver(t.Context(), delivery.Samples()[7]); !out.Delivered {
			t.Fatalf("%+v", out)
		}
	}
	if got := r.All(); string(got[0].Body) != string(got[1].Body) {
		t.Error("bodies differ")
	}
}

func readSchema(t *testing.T) map[string]any {
	t.Helper()
	text, err := os.ReadFile("notice.v1.schema.json")
	if err != nil {
		t.Fatal(err)
	}
	var schema map[string]any
	if err := json.Unmarshal(text, &schema); err != nil {
		t.Fatal(err)
	}
	return schema
}

// against checks a value by the part of JSON Schema that ours uses. Fields that
// the schema lacks are faults, which is stricter than what receivers are told.
func against(root, schema map[string]any, value any, at string) []string {
	if ref, ok := schema["$ref"].(string); ok {
		schema = root["$defs"].(map[string]any)[strings.TrimPrefix(ref, "#/$defs/")].(map[string]any)
	}
	var out []string
	fault := func(format string, args ...any) { out = append(out, at+": "+fmt.Sprintf(format, args...)) }
	for word, want := range schema {
		switch word {
		case "const":
			if !reflect.DeepEqual(value, want) {
				fault("%v is not %v", value, want)
			}
		case "enum":
			if !slices.Contains(want.([]any), value) {
				fault("%v is none of %v", value, want)
			}
		case "type":
			if names, ok := want.([]any); ok && slices.ContainsFunc(names, func(n any) bool { return isOf(value, n) }) || isOf(value, want) {
				continue
			}
			fault("%v is no %v", value, want)
		case "pattern":
			if s, ok := value.(string); ok && !regexp.MustCompile(want.(string)).MatchString(s) {
				fault("%q has not the form %s", s, want)
			}
		case "minimum":
			if v, ok := value.(float64); ok && v < want.(float64) {
				fault("%v is below %v", v, want)
			}
		case "maximum":
			if v, ok := value.(float64); ok && v > want.(float64) {
				fault("%v is above %v", v, want)
			}
		case "minItems":
			if v, ok := value.([]any); ok && float64(len(v)) < want.(float64) {
				fault("only %d items", len(v))
			}
		case "items":
			if v, ok := value.([]any); ok {
				for i := range v {
					out = append(out, against(root, want.(map[string]any), v[i], fmt.Sprintf("%s[%d]", at, i))...)
				}
			}
		case "required":
			if v, ok := value.(map[string]any); ok {
				for _, name := range want.([]any) {
					if _, there := v[name.(string)]; !there {
						fault("%s is missing", name)
					}
				}
			}
		case "properties":
			if v, ok := value.(map[string]any); ok {
				for name, field := range v {
					known, ok := want.(map[string]any)[name].(map[string]any)
					if !ok {
						fault("%s is not in the schema", name)
						continue
					}
					out = append(out, against(root, known, field, at+"."+name)...)
				}
			}
		case "$schema", "$id", "$defs", "title", "description":
		default:
			fault("the schema uses %s, which this check does not know", word)
		}
	}
	sort.Strings(out)
	return out
}

func isOf(value, name any) bool {
	switch v := value.(type) {
	case nil:
		return name == "null"
	case bool:
		return name == "boolean"
	case string:
		return name == "string"
	case float64:
		return name == "number" || name == "integer" && v == math.Trunc(v)
	case []any:
		return name == "array"
	case map[string]any:
		return name == "object"
	}
	return false
}
