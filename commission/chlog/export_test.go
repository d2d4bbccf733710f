package chlog

import "io"

// HashOf is the SHA-256 that chains lines.
var HashOf = hashOf

// Encode is a line's exact bytes.
var Encode = encode

// VerifyReader verifies a log that is nowhere on a disk, with its first detached signature.
func (v Verifier) VerifyReader(log io.Reader, signature []byte) Report {
	c := newCheck(v, "wagtail.chlog")
	c.addSignature("wagtail.chlog.sig", signature)
	if err := c.read(log); err != nil {
		c.report.err = err
		c.conclude(Unreadable, err.Error())
	}
	c.report.Exit = c.report.Outcome.Exit()
	return c.report
}
