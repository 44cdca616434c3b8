package trammel

// What the tests of package trammel_test see beside the exported names.

// Koenker is the statistic of the check for unequal spread.
func Koenker(r Result) (stat, slope float64) {
	stats, _ := r.fit().Engine.Rows()
	return koenker(r.fit(), stats)
}

var (
	Fixed       = fixed
	Figure      = figure
	Probability = probability
	Percent     = percent
)
