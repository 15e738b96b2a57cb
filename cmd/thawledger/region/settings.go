package region

import _ "embed"

// Settings is the settings file of the region; its folders are relative to it.
//
//go:embed settings.yaml
var Settings []byte
