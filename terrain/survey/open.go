package survey

import (
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"strconv"
	"strings"

	"ledgework/terrain"
	"ledgework/terrain/grid"
	"ledgework/terrain/las"
	"ledgework/terrain/ply"
	"ledgework/terrain/xyz"
)

// Options say how a survey file is read. The zero value is the default.
type Options struct {
	// CRS of the file's coordinates: EPSG:n, WKT or PROJJSON. Given, it takes
	// the place of the file's own. The default is the file's own.
	CRS string

	// Tolerant passes over recoverable defects, such as a truncated last
	// record, and counts them. The default is to refuse the file.
	Tolerant bool

	// Band of an elevation grid, counted from 1. The default is chosen by
	// the grid package.
	Band int
}

// headBytes is how much of a file is looked at to tell its format: a few lines
// of text, and more than the 227 bytes of the shortest LAS header.
const headBytes = 4096

// Open opens a survey file, whose format is told by its first bytes and never
// by its name: LAS, PLY, text points, or an elevation grid that GDAL reads.
// The reader owns the file until it is closed. Errors of Open and of the
// reader's methods start with path.
func Open(path string, opts Options) (terrain.Reader, error) {
	f, err := open(path, opts)
	if err != nil {
		return nil, err
	}
	return f, nil
}

// A file is an opened survey file. It adds the path to the errors of a codec's
// reader, and the given CRS to its header.
type file struct {
	path   string
	r      terrain.Reader
	las    *las.Reader // the same reader when the file is LAS, else nil
	header *terrain.Header
	handle *os.File // nil when GDAL holds the file
}

// open is Open with the concrete type, for its LAS sections.
func open(path string, opts Options) (*file, error) {
	head, err := readHead(path)
	if err != nil {
		return nil, err
	}
	f := &file{path: path}
	switch known, err := format(head); {
	case err != nil:
		return nil, f.wrap(err)
	case known == "grid":
		f.r, err = grid.Open(path, grid.Options{Band: opts.Band, CRS: opts.CRS})
		if err != nil {
			return nil, f.wrap(gridError(head, err))
		}
	default:
		if err := f.decode(known, opts); err != nil {
			return nil, err
		}
	}
	f.header = f.r.Header()
	if opts.CRS != "" {
		h := *f.header
		if h.CRS != "" && h.CRS != opts.CRS {
			h.Notes = append(h.Notes[:len(h.Notes):len(h.Notes)], "the given CRS takes the place of the file's own")
		}
		h.CRS = opts.CRS
		f.header = &h
	}
	return f, nil
}

// decode opens the file itself and hands it to the codec of a format.
func (f *file) decode(known string, opts Options) error {
	handle, err := os.Open(f.path)
	if err != nil {
		return fileError(f.path, err)
	}
	info, err := handle.Stat()
	if err == nil {
		switch known {
		case "las":
			f.las, err = las.NewReader(handle, info.Size(), las.Options{Tolerant: opts.Tolerant})
			f.r = f.las
		case "ply":
			f.r, err = ply.NewReader(handle, info.Size(), ply.Options{Tolerant: opts.Tolerant})
		case "xyz":
			f.r, err = xyz.NewReader(handle, info.Size(), xyz.Options{Tolerant: opts.Tolerant})
		}
	}
	if err != nil {
		return errors.Join(f.wrap(err), handle.Close())
	}
	f.handle = handle
	return nil
}

// format names the codec for a file that begins with head. "grid" means that
// GDAL has to say.
func format(head []byte) (string, error) {
	const later = "convert it to LAS or PLY until then"
	begins := func(magic string) bool {
		return len(head) >= len(magic) && string(head[:len(magic)]) == magic
	}
	switch {
	case len(head) == 0:
		return "", &terrain.FormatError{Format: "survey", Reason: "the file is empty", Remedy: "copy or export the survey again"}
	case las.Looks(head):
		return "las", nil
	case ply.Looks(head):
		return "ply", nil
	case begins("ASTM-E57"):
		return "", &terrain.UnsupportedError{Format: "survey", Feature: "E57 (not yet)", Remedy: later}
	case begins("# .PCD") || begins("VERSION .7") || begins("VERSION 0.7"):
		return "", &terrain.UnsupportedError{Format: "survey", Feature: "PCD (not yet)", Remedy: later}
	case xyz.Looks(head):
		return "xyz", nil
	}
	return "grid", nil
}

// gridError says what is wrong with a file that no codec knows by its first
// bytes and that GDAL doesn't know as a grid either; other errors of GDAL it
// returns as they are.
func gridError(head []byte, err error) error {
	if !strings.Contains(err.Error(), "not recognized as a supported file format") {
		return err
	}
	const shown = 12 // bytes: room for every magic that we know
	return &terrain.FormatError{
		Format: "survey",
		Place:  "byte 0",
		Reason: "begins with " + strconv.Quote(string(head[:min(shown, len(head))])) + ", which is no survey format that ledgework reads",
		Remedy: "give LAS, PLY, text points (XYZ, CSV, PTS) or an elevation grid that GDAL opens",
	}
}

// readHead reads the first bytes of a file, at most headBytes.
func readHead(path string) ([]byte, error) {
	info, err := os.Stat(path)
	if err != nil {
		return nil, fileError(path, err)
	}
	if info.IsDir() {
		return nil, fmt.Errorf("%s: survey: this is a folder; name the files in it", path)
	}
	if !info.Mode().IsRegular() {
		return nil, fmt.Errorf("%s: survey: not a regular file; copy the survey to a disk first", path)
	}
	f, err := os.Open(path)
	if err != nil {
		return nil, fileError(path, err)
	}
	defer f.Close()
	head := make([]byte, headBytes)
	n, err := io.ReadFull(f, head)
	if err != nil && !errors.Is(err, io.EOF) && !errors.Is(err, io.ErrUnexpectedEOF) {
		return nil, fileError(path, err)
	}
	return head[:n], nil
}

// fileError puts an operating system's error into the form of the others.
func fileError(path string, err error) error {
	var cause *fs.PathError
	if errors.As(err, &cause) {
		err = cause.Err
	}
	switch {
	case errors.Is(err, fs.ErrNotExist):
		return fmt.Errorf("%s: survey: %w; check the name", path, err)
	case errors.Is(err, fs.ErrPermission):
		return fmt.Errorf("%s: survey: %w; allow the reading of it", path, err)
	}
	return fmt.Errorf("%s: survey: %w", path, err)
}

// wrap puts the path before an error.
func (f *file) wrap(err error) error {
	if err == nil || errors.Is(err, io.EOF) {
		return err
	}
	return fmt.Errorf("%s: %w", f.path, err)
}

// Header implements terrain.Reader.
func (f *file) Header() *terrain.Header { return f.header }

// Read implements terrain.Reader.
func (f *file) Read(b *terrain.Batch) error { return f.wrap(f.r.Read(b)) }

// Consumed implements terrain.Reader.
func (f *file) Consumed() int64 { return f.r.Consumed() }

// Defects implements terrain.Reader.
func (f *file) Defects() []terrain.Defect { return f.r.Defects() }

// Close implements terrain.Reader.
func (f *file) Close() error {
	err := f.r.Close()
	if f.handle != nil {
		if closed := f.handle.Close(); err == nil && !errors.Is(closed, os.ErrClosed) {
			err = closed
		}
	}
	return f.wrap(err)
}
