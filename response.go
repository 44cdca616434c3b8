package trammel

import (
	"example.com/trammel/formula"
	"example.com/trammel/internal/handover"
)

// normalErrors tells that the modelled response is fitted with normal errors
// about its mean, so that residuals are on the scale of predictions.
func normalErrors(f *handover.Fit) bool {
	e := f.Plan.Model().Errors
	return e == nil || e.Family == "normal" && (e.Link == "" || e.Link == "identity")
}

// isColumn tells that the modelled response is a plain column.
func isColumn(f *handover.Fit) bool {
	_, ok := f.Plan.Model().Response.Value.(*formula.Name)
	return ok
}
