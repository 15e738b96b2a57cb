package store_test

import (
	"time"

	"thawledger/pipeline"
	"thawledger/pipeline/store"
)

// stated is a station with one surface whose design value is as given.
func stated(index float64, name string) store.Stated {
	return store.Stated{
		Hash: name, Program: "test",
		Stations: []pipeline.Station{{ID: "FELL", Name: name, LatitudeD: 69, Mean: pipeline.MeanMaxMin, FillDays: 2,
			ThawYear: pipeline.MonthDay{Month: time.January, Day: 15}, FreezeYear: pipeline.MonthDay{Month: time.July, Day: 15}}},
		Feeds: []pipeline.Feed{{Name: "feed"}},
		Sites: []pipeline.Site{{ID: "strip", Name: "Strip", Station: "FELL", Surfaces: []pipeline.Surface{{ID: "gravel", Name: "Gravel",
			Designs: []pipeline.DesignValue{{Kind: pipeline.Thaw, Definition: pipeline.Curve, Of: pipeline.OfAir, Index: index, Unit: pipeline.DegCDays,
				Direction: pipeline.NotAbove, From: pipeline.DayOf(1, time.January, 1), NearShare: 0.9, Source: "invented"}}}}}},
	}
}
