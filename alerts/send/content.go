package send

import (
	"encoding/json"
	"fmt"
	"time"

	"thawledger/alerts/delivery"
	"thawledger/pipeline"
	"thawledger/pipeline/store"
)

// content is what thaw.notices keeps of a notice beside its columns.
type content struct {
	Version   int             `json:"version"` // 1
	Recipient recipient       `json:"recipient"`
	Items     []delivery.Item `json:"items"`
	Cautions  []string        `json:"cautions,omitempty"`
}

type recipient struct {
	Name string             `json:"name"`
	Unit pipeline.IndexUnit `json:"unit"`
	Zone string             `json:"time_zone"`
}

const contentVersion = 1

// notice is what a channel is given.
func (s *Sender) notice(n *store.DueNotice) (delivery.Notice, error) {
	var c content
	if err := json.Unmarshal(n.Content, &c); err != nil {
		return delivery.Notice{}, fmt.Errorf("read content of notice %s: %w", n.Key, err)
	}
	if c.Version != contentVersion {
		return delivery.Notice{}, fmt.Errorf("content of notice %s is of version %d, this program knows %d", n.Key, c.Version, contentVersion)
	}
	zone, err := time.LoadLocation(c.Recipient.Zone)
	if err != nil {
		return delivery.Notice{}, fmt.Errorf("read content of notice %s: %w", n.Key, err)
	}
	out := delivery.Notice{
		Key: n.Key, Kind: delivery.Kind(n.Kind), Written: n.WrittenAt, Items: c.Items, Cautions: c.Cautions,
		Recipient: delivery.Recipient{Name: c.Recipient.Name, Unit: c.Recipient.Unit, Zone: zone},
	}
	if r := s.byID[n.Recipient]; r != nil {
		out.Recipient.Address = r.Addresses[n.Channel] // as it is now: it may have been put right
	}
	if s.SeenURL != nil {
		out.SeenURL = s.SeenURL(n.Key)
	}
	if s.HoldURL != nil {
		out.HoldURL = s.HoldURL(n.Key)
	}
	return out, nil
}
