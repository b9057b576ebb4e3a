package canvas_test

import (
	"fmt"
	"math"

	"antelag/tui/canvas"
)

func ExamplePlot() {
	var ts, target, measured []float64
	for i := range 400 {
		t := float64(i) / 100
		ts = append(ts, t)
		target = append(target, 20*math.Sin(3*t))
		measured = append(measured, 18*math.Sin(3*t-0.4))
	}
	scale := canvas.Scale{Symmetric: true}
	grid := canvas.NewGrid(50, 9)
	keys := []canvas.Key{
		{Name: "target", Ink: canvas.Target},
		{Name: "measured", Ink: canvas.Measured, Style: canvas.Dotted},
	}
	plot := canvas.Plot{X: canvas.Axis{Lo: 0, Hi: 4, Unit: "s"}, Y: canvas.Axis{Unit: "mm"}, Legend: keys}

	plot.Y.Lo, plot.Y.Hi = scale.Update(canvas.Extent(target, measured))
	plot.Begin(grid.Whole())
	plot.DrawSeries(keys[0], ts, target)
	plot.DrawSeries(keys[1], ts, measured)
	plot.End()
	fmt.Println(grid)
	// Output:
	// mm  ⠒⠒⠒⠒ target  ⠂⠐ ⠂ measured
	//  20┤   ⣠⠖⠋⠍⠓⢦⡄                 ⡠⠞⠉⠍⠓⢤⡄
	//  10┤ ⢠⠞⡁⠘    ⠙⣞ ⡀            ⢠⠞⡀⠈    ⠱⣜
	//    │⡰⢋ ⠁      ⠈⢣⡁⢀          ⡴⢣        ⠈⢦⠃
	//   0┤⡁⠈⠁⠁⠁⠁⠁⠁⠁⠁⠁⠁⠱⡌⠁⡀⠁⠁⠁⠁⠁⠁⢀⡞⡅⠈⠁⠁⠁⠁⠁⠁⠁⠁⠁⠁⢳⡘⠁⠁⠁⠁⠁⠁⠁⠁
	// -10┤⠁            ⠘⢦⡁⢀    ⣠⢫ ⠁            ⠙⣆⠃⢀    ⡠
	// -20┤               ⠑⠦⣀⣂⡤⠞⠃                ⠈⠓⢬⣀⣂⡴⠋⠂
	//    └┬──────────┬───────────┬──────────┬──────────┬
	//     0          1           2          3          s
}
