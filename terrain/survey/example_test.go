package survey_test

import (
	"fmt"

	"ledgework/terrain/survey"
)

// A person's footprint of 0.3 m radius on a scan whose points are 13 mm apart.
func ExampleAutoSpacing() {
	fmt.Println(survey.AutoSpacing(0.3, 0.013))
	fmt.Println(survey.AutoSpacing(0.3, 0.040))
	// Output:
	// 0.05
	// 0.1
}
