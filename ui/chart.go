package ui

import (
	"image"

	"fyne.io/fyne/v2"
	"fyne.io/fyne/v2/canvas"
	"fyne.io/fyne/v2/widget"

	"evenstep/display/report"
)

// chartView shows a chart at the resolution of the screen.
type chartView struct {
	widget.BaseWidget
	raster *canvas.Raster
	chart  report.Chart
	least  fyne.Size
}

func newChartView(least fyne.Size) *chartView {
	c := &chartView{least: least}
	c.raster = canvas.NewRaster(c.draw)
	c.ExtendBaseWidget(c)
	return c
}

// show puts another chart in place.
func (c *chartView) show(chart report.Chart) {
	c.chart = chart
	c.raster.Refresh()
}

func (c *chartView) draw(w, h int) image.Image {
	size := c.Size()
	scale := 1.0
	if size.Width > 0 {
		scale = float64(w) / float64(size.Width)
	}
	p := newPicture(w, h, scale)
	if w > 40 && h > 40 {
		const margin = 4
		c.chart.Draw(p, report.Box{X: margin, Y: margin, W: float64(w)/scale - 2*margin, H: float64(h)/scale - 2*margin}, 11)
	}
	return p.img
}

// CreateRenderer implements fyne.Widget.
func (c *chartView) CreateRenderer() fyne.WidgetRenderer { return widget.NewSimpleRenderer(c.raster) }

// MinSize implements fyne.CanvasObject.
func (c *chartView) MinSize() fyne.Size { return c.least }
