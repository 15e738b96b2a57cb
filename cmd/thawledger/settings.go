package main

import (
	"fmt"
	"os"
	"path/filepath"
)

// settings is the command `settings check|show`. Nothing is started by it.
func (p program) settings(args []string) error {
	const synopsis = "settings check|show [--settings FILE]: look at the settings without starting anything"
	f := p.flags("settings", synopsis)
	file := f.String("settings", "settings.yaml", "settings `file`")
	if len(args) == 0 || args[0] != "check" && args[0] != "show" {
		f.Usage()
		return errUsage
	}
	if _, err := parse(f, args[1:], 0); err != nil {
		return err
	}
	set, err := p.load(*file)
	if err != nil {
		return err
	}
	if args[0] == "show" {
		return set.Show(p.out)
	}
	surfaces, designs := 0, 0
	for _, site := range set.Sites {
		surfaces += len(site.Surfaces)
		for _, s := range site.Surfaces {
			designs += len(s.Designs)
		}
	}
	fmt.Fprintf(p.out, "%s: no faults; %d stations, %d feeds, %d sites, %d surfaces, %d design values\n",
		*file, len(set.Stations), len(set.Feeds), len(set.Sites), surfaces, designs)
	return nil
}

// defaultData is the data folder where the settings name none: where the system
// keeps such things for root, else where the user does.
func defaultData() string {
	if os.Geteuid() == 0 {
		return "/var/lib/thawledger"
	}
	if dir := os.Getenv("XDG_STATE_HOME"); filepath.IsAbs(dir) {
		return filepath.Join(dir, "thawledger")
	}
	home, err := os.UserHomeDir()
	if err != nil {
		return filepath.Join(os.TempDir(), "thawledger")
	}
	return filepath.Join(home, ".local", "state", "thawledger")
}
