// Package chlog writes, reads, signs and verifies the log of a walk: text lines chained by SHA-256, each on disk before it
// is acknowledged, signed by OpenSSH keys.
//
// Start at [Writer]: [Create] begins a log, [Resume] goes on after any end without a seal, [Writer.Append] adds a record.
// [NewReader] reads strictly and says where a log is damaged; [Verifier.Verify] says what may be relied on, and how far.
// [SignFile] makes the detached signature beside a sealed log.
//
// A line is {"prev":"…","seq":N,"at":"…","kind":"…","body":{…}} and a line feed; prev is the SHA-256 of the line before
// with its line feed. FORMAT.md in this folder describes everything a reader needs, with an example of every record.
package chlog
