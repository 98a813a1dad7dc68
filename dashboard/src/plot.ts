// A plot in the page: one chart per element, redrawn when its option or its size changes.
import { LineChart } from 'echarts/charts';
import { GridComponent, LegendComponent, MarkLineComponent, PolarComponent } from 'echarts/components';
import { type EChartsType, init, use } from 'echarts/core';
import { SVGRenderer } from 'echarts/renderers';
import { type ComponentChild, h } from 'preact';
import { useEffect, useRef } from 'preact/hooks';
import type { PlotOption } from '../plots/palette.ts';

use([LineChart, GridComponent, LegendComponent, MarkLineComponent, PolarComponent, SVGRenderer]);

export function Plot({ option, label }: { option: PlotOption; label: string }): ComponentChild {
  const element = useRef<HTMLDivElement>(null);
  const chart = useRef<EChartsType>(undefined);
  useEffect(() => {
    const drawn = init(element.current!, null, { renderer: 'svg' });
    chart.current = drawn;
    const sizes = new ResizeObserver(() => drawn.resize());
    sizes.observe(element.current!);
    return () => {
      sizes.disconnect();
      drawn.dispose();
    };
  }, []);
  useEffect(() => {
    // Nothing of the option before may stay: the next file can have fewer cuts.
    chart.current?.setOption(option, { notMerge: true });
  }, [option]);
  return h('div', { class: 'plot', ref: element, role: 'img', 'aria-label': label });
}
