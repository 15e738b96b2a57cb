package main

import (
	"errors"

	"thawledger/indices/ground"
	"thawledger/pipeline"
	"thawledger/pipeline/settings"
)

// withGround has the settings' ground looked at, and depths of thaw turned into the
// indices that reach them: settings know nothing of that arithmetic.
func withGround(set *settings.Settings) error {
	return set.Ground(
		func(layers []pipeline.Layer) (int, error) {
			_, err := ground.Build(layers)
			if at, ok := errors.AsType[*ground.LayerError](err); ok {
				return at.Layer, at.Err
			}
			return 0, err
		},
		func(layers []pipeline.Layer, depthM float64) (float64, error) {
			p, err := ground.Build(layers)
			if err != nil {
				return 0, err
			}
			return p.IndexToThaw(depthM)
		})
}
