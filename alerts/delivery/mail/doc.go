// Package mail delivers notices by e-mail through one SMTP server (RFC 5321).
//
//	Notice -> text.Texts -> message -> STARTTLS, login, MAIL, RCPT, DATA -> Outcome
//
// The connection is encrypted unless settings say why not, and a password is
// never sent in the clear. A message is plain text, the same as HTML, and charts
// that the HTML shows. Its Message-ID comes from the notice's key, so a notice
// that is sent twice can be recognised; updates and withdrawals cite the first
// notice, so that mail programs show them as one conversation; Auto-Submitted
// (RFC 3834) keeps other programs from answering.
//
// A temporary refusal (4yz) and trouble with the connection are worth trying
// again; a lasting refusal (5yz) is not. If the connection breaks after the
// server was given the message and before it said so, nobody can know whether it
// was taken: that counts as not delivered.
//
// No connection outlives its delivery, and none outlives the context.
package mail
