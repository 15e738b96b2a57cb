package main

import (
	"context"
	"fmt"
	"net"
	"time"

	"go.uber.org/zap"

	"thawledger/alerts/delivery"
	"thawledger/alerts/delivery/capfeed"
	"thawledger/alerts/delivery/mail"
	"thawledger/alerts/delivery/text"
	"thawledger/alerts/delivery/webhook"
	"thawledger/alerts/send"
	"thawledger/pipeline"
	"thawledger/pipeline/lifecycle"
)

// newSender returns what sends notices by the channels of the settings.
func (d *daemon) newSender(now func() time.Time) (*send.Sender, error) {
	texts, err := text.Load("")
	if err != nil {
		return nil, fmt.Errorf("texts of notices: %w", err)
	}
	channels := map[string]delivery.Channel{}
	for i := range d.set.Channels {
		c := &d.set.Channels[i]
		var made delivery.Channel
		switch {
		case c.Mail != nil:
			made, err = mail.New(mailSettings(c.Mail), texts)
		case c.Webhook != nil:
			made, err = webhook.New(webhook.Settings{Address: c.Webhook.Address, WhyNone: c.Webhook.WhyNone, SecretFile: c.Webhook.KeyFile, Now: now}, texts)
		case c.CAP != nil:
			made, err = capfeed.New(capSettings(c.CAP, now), texts, send.Shelf{DB: d.db, Channel: c.Name, Now: now})
		default:
			err = fmt.Errorf("it is no way of sending that is known here")
		}
		if err != nil {
			return nil, fmt.Errorf("channel %s: %w", c.Name, err)
		}
		channels[c.Name] = made
	}
	return send.New(send.Config{DB: d.db, Channels: channels, Recipients: d.set.Recipients, Sites: d.set.Sites, Log: d.log.Named("send"), Now: now}), nil
}

func mailSettings(m *pipeline.MailChannel) mail.Settings {
	return mail.Settings{Host: m.Host, Port: m.Port, Encryption: mail.Encryption(m.Encryption), WhyNone: m.WhyNone, User: m.User,
		PasswordFile: m.PasswordFile, From: m.From, ReplyTo: m.ReplyTo}
}

func capSettings(c *pipeline.CAPChannel, now func() time.Time) capfeed.Settings {
	return capfeed.Settings{Sender: c.Sender, SenderName: c.SenderName, Contact: c.Contact, Actual: c.Actual, Scope: capfeed.Scope(c.Scope),
		Restriction: c.Restriction, Addresses: c.Addresses, Language: c.Language, BaseURL: c.BaseURL, FeedID: c.FeedID, Title: c.Title, Now: now}
}

// sending are the stages that send notices and serve feeds. They belong to the
// stage alerts, and stop after it.
func (d *daemon) sending(now func() time.Time) []lifecycle.Stage {
	out := []lifecycle.Stage{{Name: "send", Run: d.sender.Run}}
	for i := range d.set.Channels {
		c := &d.set.Channels[i]
		if c.CAP == nil {
			continue
		}
		log := d.log.Named("feed")
		out = append(out, lifecycle.Stage{Name: "feed " + c.Name, Run: func(intake, _ context.Context) error {
			return send.ServeFeed(intake, c.CAP.Listen, capSettings(c.CAP, now), send.Shelf{DB: d.db, Channel: c.Name, Now: now}, log, func(at net.Addr) {
				log.Info("the feed is served", zap.String("channel", c.Name), zap.Stringer("address", at))
			})
		}})
	}
	return out
}
