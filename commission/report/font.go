package report

import (
	"bytes"
	"encoding/binary"
	"fmt"
	"sync"

	"codeberg.org/go-pdf/fpdf"
	"github.com/go-fonts/dejavu/dejavusans"
	"github.com/go-fonts/dejavu/dejavusansbold"
	"github.com/go-fonts/dejavu/dejavusansmono"
)

// face is one of the fonts of a page.
type face struct{ family, style string }

var (
	regular = face{"sans", ""}
	bold    = face{"sans", "B"}
	mono    = face{"mono", ""}
)

// addFonts embeds the fonts. The library writes into the bytes it gets, so each document gets a copy of its own: with the
// shared bytes the second document of a process would differ from the first.
func addFonts(pdf *fpdf.Fpdf) {
	pdf.AddUTF8FontFromBytes(regular.family, regular.style, bytes.Clone(dejavusans.TTF))
	pdf.AddUTF8FontFromBytes(bold.family, bold.style, bytes.Clone(dejavusansbold.TTF))
	pdf.AddUTF8FontFromBytes(mono.family, mono.style, bytes.Clone(dejavusansmono.TTF))
}

// draws gives whether a face has a glyph for a character.
func draws(f face) func(rune) bool {
	set := glyphs()[f]
	return func(r rune) bool { return set[r] }
}

var glyphs = sync.OnceValue(func() map[face]map[rune]bool {
	sets := map[face]map[rune]bool{}
	for f, ttf := range map[face][]byte{regular: dejavusans.TTF, bold: dejavusansbold.TTF, mono: dejavusansmono.TTF} {
		set, err := charactersOf(ttf)
		if err != nil {
			panic(fmt.Sprintf("report: built-in font: %v", err)) // the same bytes in every build
		}
		sets[f] = set
	}
	return sets
})

// charactersOf reads the characters that a TrueType font has glyphs for, from its cmap subtable of format 4 (OpenType 1.9,
// "cmap"): the Basic Multilingual Plane, which is what the PDF library can write.
func charactersOf(ttf []byte) (map[rune]bool, error) {
	u16 := func(at int) int { return int(binary.BigEndian.Uint16(ttf[at:])) }
	u32 := func(at int) int { return int(binary.BigEndian.Uint32(ttf[at:])) }
	for t := range u16(4) {
		entry := 12 + 16*t
		if string(ttf[entry:entry+4]) != "cmap" {
			continue
		}
		cmap := u32(entry + 8)
		for k := range u16(cmap + 2) {
			sub := cmap + u32(cmap+4+8*k+4)
			if u16(sub) == 4 {
				return segments(u16, sub), nil
			}
		}
	}
	return nil, fmt.Errorf("no character table of format 4")
}

func segments(u16 func(int) int, sub int) map[rune]bool {
	set := map[rune]bool{}
	count := u16(sub+6) / 2
	ends, starts := sub+14, sub+16+2*count
	deltas, offsets := starts+2*count, starts+4*count
	for s := range count {
		for c := u16(starts + 2*s); c <= u16(ends+2*s) && c != 0xFFFF; c++ {
			glyph := c
			if offset := u16(offsets + 2*s); offset != 0 {
				glyph = u16(offsets + 2*s + offset + 2*(c-u16(starts+2*s)))
			}
			if glyph != 0 {
				glyph = (glyph + u16(deltas+2*s)) & 0xFFFF
			}
			if glyph != 0 {
				set[rune(c)] = true
			}
		}
	}
	return set
}
