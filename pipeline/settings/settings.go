package settings

import (
	"bytes"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"time"

	"go.yaml.in/yaml/v4"

	"thawledger/pipeline"
)

// Settings is everything that the settings file says, defaults filled in.
type Settings struct {
	Data       string // data folder; "" if the file names none
	Store      Store
	Bus        Bus
	Listen     Listen
	Work       Work
	Stations   []pipeline.Station
	Layouts    map[string]*pipeline.Layout // by name, as declared, for no station yet
	Feeds      []pipeline.Feed
	Sites      []pipeline.Site
	Channels   []pipeline.Channel
	Recipients []pipeline.Recipient
	Hash       string // SHA-256 of the settings in force

	text      string // see Text
	defaulted map[string]bool
	order     []string // layouts in the order of the file
	urlFile   string
	places    places
}

// Store says where the database is.
type Store struct {
	URL      string // a server of the agency's; "" for a private one in the data folder
	Binaries string // folder of the private server's binaries; "" to look for them
}

// Bus says what carries the messages.
type Bus struct {
	URL             string // a cluster; "" for the server inside the process
	CredentialsFile string
	Replicas        int
	Listen          string // loopback address at which the inner server listens; "" for not at all
}

// Work says how work is done.
type Work struct {
	CommitReadings   int
	RepublishAfter   time.Duration
	RepublishAllowed int
	FailuresAllowed  int
	IdleDeadline     time.Duration
}

// Warning is something that is not wrong, and had better be known.
type Warning Fault

// String returns file:line:col: path: text.
func (w Warning) String() string { return Fault(w).String() }

// maxBytes is far above any settings that a person writes.
const maxBytes = 16 << 20

// Check says what keeps a feed's layout from being made ready for reading; one
// fault a line, each beginning with the layout's field and a colon.
type Check func(*pipeline.Layout) error

// Load reads the settings file at path. Relative folders and files in it are
// relative to its own folder. The error is a Faults, or one of reading the file.
func Load(path string, checks ...Check) (*Settings, []Warning, error) {
	info, err := os.Stat(path)
	if err == nil && info.Size() > maxBytes {
		err = fmt.Errorf("%s has %d bytes, settings have at most %d", path, info.Size(), maxBytes)
	}
	if err != nil {
		return nil, nil, fmt.Errorf("read settings: %w", err)
	}
	data, err := os.ReadFile(path)
	if err != nil {
		return nil, nil, fmt.Errorf("read settings: %w", err)
	}
	return Parse(path, data, filepath.Dir(path), checks...)
}

// Parse reads settings from data; name is how faults call the file, base is the
// folder that relative names in it are relative to.
func Parse(name string, data []byte, base string, checks ...Check) (*Settings, []Warning, error) {
	r := &reader{file: name, defaulted: map[string]bool{}}
	s := &Settings{Layouts: map[string]*pipeline.Layout{}, defaulted: r.defaulted, places: places{file: name}}
	if root := r.root(data); root != nil {
		r.read(s, root, base)
		if len(r.faults) == 0 {
			r.checkLayouts(s, root, checks)
		}
	}
	if len(r.faults) > 0 {
		return nil, r.warnings, r.faults.sorted()
	}
	s.finish()
	return s, r.warnings, nil
}

// root returns the file's top mapping; nil if there is none.
func (r *reader) root(data []byte) *yaml.Node {
	var doc yaml.Node
	d := yaml.NewDecoder(bytes.NewReader(data))
	if err := d.Decode(&doc); err != nil {
		line, text := 1, strings.TrimPrefix(err.Error(), "yaml: ")
		if loads, ok := errors.AsType[*yaml.LoadErrors](err); ok && len(loads.Errors) > 0 {
			line, text = loads.Errors[0].Mark.Line, loads.Errors[0].Message
		}
		_, _ = fmt.Sscanf(text, "line %d: ", &line)
		r.fault(&yaml.Node{Line: max(line, 1), Column: 1}, "", "", "this is not YAML: %s", text)
		return nil
	}
	if doc.Kind != yaml.DocumentNode || len(doc.Content) == 0 || doc.Content[0].Kind != yaml.MappingNode {
		r.fault(&yaml.Node{Line: 1, Column: 1}, "", "see README.md for a small complete file", "the settings are not a mapping")
		return nil
	}
	return doc.Content[0]
}

func (r *reader) read(s *Settings, root *yaml.Node, base string) {
	o := r.object(root, "", root)
	within := func(path string) string {
		if path == "" || filepath.IsAbs(path) {
			return path
		}
		return filepath.Join(base, path)
	}
	s.Data = within(o.textOr("data", ""))
	r.readStore(s, r.object(o.get("store"), "store", root), within)
	r.readBus(s, r.object(o.get("bus"), "bus", root), within)
	r.readWork(s, r.object(o.get("work"), "work", root))
	stations := r.readStations(s, o, within)
	r.readLayouts(s, o)
	r.readFeeds(s, o, stations, within)
	r.readPush(s, r.object(o.get("push"), "push", root), within)
	r.readSites(s, o, stations)
	r.readChannels(s, o, within)
	r.readRecipients(s, o)
	o.done()
}

func (r *reader) readStore(s *Settings, o *object, within func(string) string) {
	s.Store.URL = o.textOr("url", "")
	s.urlFile = within(o.textOr("url_file", ""))
	private := r.object(o.get("private"), o.at("private"), o.node)
	s.Store.Binaries = within(private.textOr("binaries", ""))
	private.done()
	o.done()
	if s.urlFile == "" {
		return
	}
	if s.Store.URL != "" {
		r.fault(o.keys["url_file"], o.at("url_file"), "leave one of them out", "url is given as well")
		return
	}
	text, err := os.ReadFile(s.urlFile)
	if err != nil {
		r.fault(o.vals["url_file"], o.at("url_file"), "it holds the database's address, postgres://...", "%v", err)
		return
	}
	s.Store.URL = strings.TrimSpace(string(text))
}

func (r *reader) readBus(s *Settings, o *object, within func(string) string) {
	one := 1.0
	s.Bus = Bus{URL: o.textOr("url", ""), CredentialsFile: within(o.textOr("credentials_file", "")), Replicas: o.whole("replicas", &one, 1, 5),
		Listen: o.textOr("listen", "")}
	o.done()
	for _, key := range []string{"credentials_file", "replicas"} {
		if s.Bus.URL == "" && o.has(key) {
			r.fault(o.keys[key], o.at(key), "leave it out, or give bus.url", "it is for a cluster, and no bus.url is given")
		}
	}
	if s.Bus.URL != "" && s.Bus.Listen != "" {
		r.fault(o.keys["listen"], o.at("listen"), "leave it out", "it is for the bus inside the process, and bus.url is given")
	}
}

func (r *reader) readWork(s *Settings, o *object) {
	commit, republish, failures := 100000.0, 3.0, 3.0
	s.Work = Work{
		CommitReadings:   o.whole("commit_readings", &commit, 500, 1e6),
		RepublishAfter:   o.duration("republish_after", 2*time.Minute),
		RepublishAllowed: o.whole("republish_allowed", &republish, 1, 100),
		FailuresAllowed:  o.whole("failures_allowed", &failures, 1, 100),
		IdleDeadline:     o.duration("idle_deadline", 30*time.Minute),
	}
	o.done()
}
