package chlog

import (
	"context"
	"io"
	"os"
	"sync/atomic"
)

// meter counts bytes over many files.
type meter struct {
	total int64
	done  atomic.Int64
	tell  func(done, total int64)
}

func newMeter(paths []string, tell func(done, total int64)) *meter {
	m := &meter{tell: tell}
	for _, p := range paths {
		if info, err := os.Stat(p); err == nil && info.Mode().IsRegular() {
			m.total += info.Size()
		}
	}
	return m
}

// of counts what is read from r, and ends it when ctx does.
func (m *meter) of(ctx context.Context, r io.Reader) io.Reader { return &metered{ctx, m, r} }

type metered struct {
	ctx context.Context
	m   *meter
	r   io.Reader
}

func (m *metered) Read(p []byte) (int, error) {
	if err := m.ctx.Err(); err != nil {
		return 0, err
	}
	n, err := m.r.Read(p)
	done := m.m.done.Add(int64(n))
	if m.m.tell != nil {
		m.m.tell(done, m.m.total)
	}
	return n, err
}
