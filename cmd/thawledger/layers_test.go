package main

import (
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strings"
	"testing"
)

// imports returns what each package of the module imports, tests left out.
func imports(t *testing.T) map[string][]string {
	t.Helper()
	list := exec.Command("go", "list", "-f", `{{.ImportPath}} {{join .Imports " "}}`, "thawledger/...")
	list.Stderr = os.Stderr
	text, err := list.Output()
	if err != nil {
		t.Fatal(err)
	}
	out := map[string][]string{}
	for line := range strings.Lines(string(text)) {
		words := strings.Fields(line)
		out[strings.TrimPrefix(words[0], "thawledger/")] = words[1:]
	}
	if len(out) < 10 {
		t.Fatalf("only %d packages found", len(out))
	}
	return out
}

// A library that is spoken to in one place can be changed in one place.
func TestLibrariesStayWhereTheyBelong(t *testing.T) {
	belongs := map[string][]string{
		"github.com/jackc/pgx":     {"pipeline/store", "pipeline/pipelinetest"},
		"github.com/nats-io":       {"pipeline/bus"},
		"github.com/robfig/cron":   {"ingest", "pipeline/settings"},
		"go.yaml.in/yaml":          {"pipeline/settings"},
		"golang.org/x/text":        {"ingest/unpack"},
		"github.com/klauspost":     {"ingest/unpack"},
		"net/http":                 {"ingest/fetch", "ingest/push", "alerts/delivery/webhook", "alerts/delivery/capfeed", "alerts/delivery/deliverytest", "alerts/send"},
		"golang.org/x/time":        {"alerts/send"},
		"github.com/wneessen":      {"alerts/delivery/mail"},
		"github.com/emersion":      {"alerts/delivery/deliverytest"},
		"golang.org/x/image":       {"alerts/delivery/chart"},
		"os/exec":                  {"pipeline/localpg"},
		"database/sql":             nil,
		"go.uber.org/goleak":       {"pipeline/pipelinetest"},
		"testing":                  {"pipeline/pipelinetest"},
		"github.com/google/go-cmp": nil,
		// what only tests import
		"thawledger/pipeline/pipelinetest":        nil,
		"thawledger/alerts/delivery/deliverytest": nil,
	}
	for from, list := range imports(t) {
		for _, to := range list {
			for library, where := range belongs {
				if (to == library || strings.HasPrefix(to, library+"/")) && !slices.Contains(where, from) {
					t.Errorf("%s imports %s, which belongs to %v", from, to, where)
				}
			}
		}
	}
}

// cmd -> stages -> pipeline/... -> pipeline; stages never import one another.
func TestStagesStandApart(t *testing.T) {
	stages := []string{"ingest", "indices", "alerts"}
	for from, list := range imports(t) {
		of, _, _ := strings.Cut(from, "/")
		for _, to := range list {
			to, ours := strings.CutPrefix(to, "thawledger/")
			if !ours {
				continue
			}
			stage, _, _ := strings.Cut(to, "/")
			switch {
			case of == "cmd":
			case slices.Contains(stages, stage) && stage != of:
				t.Errorf("%s imports %s of another stage", from, to)
			case stage == "cmd", of == "pipeline" && stage != "pipeline":
				t.Errorf("%s imports %s, which is above it", from, to)
			}
		}
	}
}

// pure are the packages of arithmetic.
var pure = []string{
	"pipeline", "ingest/normal", "ingest/csvfeed", "ingest/plausible",
	"indices/daily", "indices/compensated", "indices/degreeday", "indices/filling", "indices/quality", "indices/surface", "indices/extreme", "indices/trend",
	"indices/chance", "indices/ground", "indices/heat", "indices/outlook",
	"alerts/judge",
}

// rules are packages that decide as purely, and have no figures of their own.
var rules = []string{"alerts/delivery", "alerts/gather"}

// Arithmetic has no files, no network, no clock to wait on, and no log, and
// stands on nothing of ours but arithmetic.
func TestArithmeticIsPure(t *testing.T) {
	impure := []string{"os", "net", "log", "sync", "go.uber.org", "github.com", "golang.org", "embed"}
	all := imports(t)
	for _, from := range slices.Concat(pure, rules) {
		if all[from] == nil {
			t.Errorf("there is no package %s", from)
		}
		for _, to := range all[from] {
			if of, ours := strings.CutPrefix(to, "thawledger/"); ours && !slices.Contains(slices.Concat(pure, rules), of) {
				t.Errorf("%s imports %s, which is not pure", from, to)
			}
			for _, bad := range impure {
				if to == bad || strings.HasPrefix(to, bad+"/") {
					t.Errorf("%s imports %s", from, to)
				}
			}
		}
	}
	for from := range all {
		if strings.HasPrefix(from, "indices/") && from != "indices/traps" && !slices.Contains(pure, from) {
			t.Errorf("%s is below indices, and not among the pure packages", from)
		}
	}
}

func TestTopLevel(t *testing.T) {
	known := []string{"cmd", "pipeline", "ingest", "indices", "alerts", "deploy", "testdata", "go.mod", "go.sum", "README.md", "DEVELOPERS.md",
		"thawledger"} // the last is what deploy/demo builds
	entries, err := os.ReadDir(filepath.Join("..", ".."))
	if err != nil {
		t.Fatal(err)
	}
	for _, e := range entries {
		if !strings.HasPrefix(e.Name(), ".") && !slices.Contains(known, e.Name()) {
			t.Errorf("%s does not belong at the top", e.Name())
		}
	}
}
