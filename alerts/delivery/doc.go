// Package delivery says what a notice is and what a channel does with it.
//
//	Notice -> Channel.Deliver -> Outcome
//	  text       subject, plain text, HTML, charts: what all channels say
//	  mail       an e-mail through an SMTP server
//	  webhook    signed JSON to a web address
//	  capfeed    a CAP 1.2 message on an Atom feed
//
// A channel takes one finished notice to one recipient and says what came of
// it: delivered, or not, and whether trying again may help. It keeps nothing and
// decides nothing else; who hears of what, when to try again and the record of
// it all are the caller's. Nothing here knows the database.
//
// A notice may be delivered twice: a connection can break after the receiver
// has taken it and before it says so. Its key is the same each time, and every
// channel passes it on so that receivers can drop repeats.
//
// A new channel is a folder with a type that has Deliver, and a line in the
// tests of deliverytest, which every channel passes against a real receiver.
package delivery
