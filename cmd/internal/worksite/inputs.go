package worksite

import (
	"cmp"
	"context"
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"slices"
	"sync"
	"sync/atomic"

	"ledgework/export"
	"ledgework/terrain"
	"ledgework/terrain/survey"
)

// inputs describes the files of the surveys for the record, in order of their
// names. Checksums follow in checksums.
func (r *run) inputs(sources []survey.Source, of []*Survey, headers []*terrain.Header, counts *survey.Counts) []export.Input {
	in := make([]export.Input, len(sources))
	for i, s := range sources {
		h, c := headers[i], &counts.Files[i]
		in[i] = export.Input{
			File: r.relative(s.Path), Bytes: h.Bytes, Format: h.Format,
			Date: cmp.Or(of[i].Date, h.Date), CRS: h.CRS, Points: c.Read,
		}
		for _, d := range c.Defects {
			in[i].Defects = append(in[i].Defects, defectText(d))
		}
	}
	slices.SortFunc(in, func(a, b export.Input) int { return cmp.Compare(a.File, b.File) })
	return in
}

// defectText says how often something was wrong, and where first.
func defectText(d terrain.Defect) string {
	return fmt.Sprintf("%s: %d times, first at %s", d.Reason, d.Count, d.First)
}

// relative is a path as the worksite could name it, for Resolve.
func (w *Worksite) relative(path string) string {
	return relativeTo(filepath.Dir(w.path), path)
}

// checksums fills in the SHA-256 of every input.
func (r *run) checksums(ctx context.Context, in []export.Input) error {
	var total int64
	for i := range in {
		total += in[i].Bytes
	}
	return r.stages.do(ctx, "checksums", total, Bytes, func() (string, error) {
		var (
			wg   sync.WaitGroup
			next atomic.Int64
			done atomic.Int64
			mu   sync.Mutex
			fail error
		)
		for range min(r.opts.Threads, len(in)) {
			wg.Go(func() {
				for i := next.Add(1) - 1; int(i) < len(in); i = next.Add(1) - 1 {
					sum, err := checksum(ctx, r.Resolve(filepath.FromSlash(in[i].File)))
					mu.Lock()
					in[i].SHA256 = sum
					if fail == nil {
						fail = err
					}
					r.opts.Progress.Set(done.Add(in[i].Bytes))
					mu.Unlock()
				}
			})
		}
		wg.Wait()
		return "SHA-256", surveyError(ctx, fail)
	})
}

// checksum is the SHA-256 of a file, in hexadecimal.
func checksum(ctx context.Context, path string) (string, error) {
	f, err := os.Open(path)
	if err != nil {
		return "", err
	}
	defer f.Close()
	sum := sha256.New()
	for {
		const step = 16 << 20 // how often an interrupt is looked for: every few hundredths of a second
		if err := ctx.Err(); err != nil {
			return "", err
		}
		if _, err := io.CopyN(sum, f, step); errors.Is(err, io.EOF) {
			return hex.EncodeToString(sum.Sum(nil)), nil
		} else if err != nil {
			return "", err
		}
	}
}
