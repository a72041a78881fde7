// Package worksite is the file that describes a job, and the job itself: from
// survey files to a folder of layers.
//
// A worksite is YAML. Every key is optional but surveys, unknown keys are
// errors, and every error names file, line and column. [Default] is the one
// place that says what an absent key means; [Worksite.Text] prints all of it
// with a comment on each key.
package worksite
