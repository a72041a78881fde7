package export

import (
	"encoding/json"
	"fmt"
	"io"
)

// Program is the value of Record.Program, by which a run folder is known.
const Program = "ledgework"

// RecordName is the name of the record in a run folder.
const RecordName = "run.json"

// RecordFormat is the version of the record's structure. It grows when a
// member changes its meaning.
const RecordFormat = 1

// A Record says how a run folder came about. Times and machine stand only
// here: everything else in the folder depends on the inputs alone.
type Record struct {
	Program  string `json:"program"`
	Version  string `json:"version"`
	Format   int    `json:"format"`
	Command  string `json:"command"` // "build", "compare"
	Caution  string `json:"caution"`
	Started  string `json:"started"` // RFC 3339
	Finished string `json:"finished"`
	Outcome  string `json:"outcome"` // what came out, in one line

	Site       string           `json:"site"`
	CRS        CRS              `json:"crs"`
	Frame      string           `json:"frame,omitempty"` // see Site.Frame
	SpacingM   float64          `json:"spacing_m"`
	Inputs     []Input          `json:"inputs"`
	Parameters any              `json:"parameters"` // the worksite with every default filled in
	Counts     map[string]int64 `json:"counts"`
	Outputs    []Output         `json:"outputs"`
	Warnings   []string         `json:"warnings"`
	Timings    []Timing         `json:"timings"`
	System     System           `json:"system"`
}

// An Input is a file that was read.
type Input struct {
	File    string   `json:"file"` // as the worksite names it
	SHA256  string   `json:"sha256"`
	Bytes   int64    `json:"bytes"`
	Format  string   `json:"format"`
	Date    string   `json:"date,omitempty"`
	CRS     string   `json:"crs,omitempty"`
	Points  int64    `json:"points"` // read, before cleaning
	Defects []string `json:"defects,omitempty"`
}

// An Output is a file that was written.
type Output struct {
	File   string `json:"file"` // within the run folder, with slashes
	SHA256 string `json:"sha256"`
	Bytes  int64  `json:"bytes"`
}

// A Timing is how long a stage took.
type Timing struct {
	Stage   string  `json:"stage"`
	Seconds float64 `json:"seconds"`
}

// A System is what the run ran on.
type System struct {
	OS              string `json:"os"`
	Arch            string `json:"arch"`
	Threads         int    `json:"threads"`
	Go              string `json:"go"`
	GDAL            string `json:"gdal,omitempty"`
	PeakMemoryBytes int64  `json:"peak_memory_bytes,omitempty"`
}

// WriteRecord writes r as JSON, with Program, Format and Caution filled in and
// empty lists for missing ones.
func WriteRecord(w io.Writer, r Record) error {
	r.Program, r.Format, r.Caution = Program, RecordFormat, Caution
	if r.Inputs == nil {
		r.Inputs = []Input{}
	}
	if r.Outputs == nil {
		r.Outputs = []Output{}
	}
	if r.Warnings == nil {
		r.Warnings = []string{}
	}
	if r.Timings == nil {
		r.Timings = []Timing{}
	}
	if r.Counts == nil {
		r.Counts = map[string]int64{}
	}
	e := json.NewEncoder(w)
	e.SetIndent("", "  ")
	e.SetEscapeHTML(false)
	if err := e.Encode(r); err != nil {
		return fmt.Errorf("export: %s: %w", RecordName, err)
	}
	return nil
}

// ReadRecord reads what WriteRecord wrote. Parameters come back as the plain
// values of package encoding/json. A record of another program, or of a later
// format, is an error.
func ReadRecord(r io.Reader) (*Record, error) {
	var rec Record
	if err := json.NewDecoder(io.LimitReader(r, maxRecordBytes)).Decode(&rec); err != nil {
		return nil, fmt.Errorf("export: %s: %w", RecordName, err)
	}
	if rec.Program != Program {
		return nil, fmt.Errorf("export: %s: program is %q, not %q", RecordName, rec.Program, Program)
	}
	if rec.Format < 1 || rec.Format > RecordFormat {
		return nil, fmt.Errorf("export: %s: format %d is not one of 1 to %d; a later version wrote it", RecordName, rec.Format, RecordFormat)
	}
	return &rec, nil
}

// maxRecordBytes bounds the memory for a record: a million warnings and
// inputs stay below it.
const maxRecordBytes = 256 << 20
