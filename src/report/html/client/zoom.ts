import { formatTime } from '../../../units.js';
import type { Chart } from './echarts.js';

const NARROWEST = 0.5; // per cent of the run

/** Buttons that zoom and move the time axis; what is in view is said beside them. */
export function zoomButtons(chart: Chart, endPs: number): void {
  const output = document.querySelector('[data-zoomed]');
  let [start, end] = [0, 100]; // per cent in view
  const say = (): void => {
    const text =
      start <= 0 && end >= 100 ? '' : `${formatTime((endPs * start) / 100)} to ${formatTime((endPs * end) / 100)}`;
    if (output !== null) output.textContent = text;
  };
  const go = (from: number, to: number): void => {
    const width = Math.min(100, Math.max(NARROWEST, to - from));
    const at = Math.min(100 - width, Math.max(0, from));
    chart.dispatchAction({ type: 'dataZoom', start: at, end: at + width });
  };
  chart.on('datazoom', () => {
    const [zoom] = (chart.getOption() as { dataZoom: { start: number; end: number }[] }).dataZoom;
    start = zoom.start;
    end = zoom.end;
    say();
  });
  for (const button of document.querySelectorAll<HTMLButtonElement>('[data-zoom]')) {
    button.addEventListener('click', () => {
      const [middle, width] = [(start + end) / 2, end - start];
      const move = { in: [middle - width / 4, middle + width / 4], out: [middle - width, middle + width] }[
        button.dataset.zoom ?? ''
      ];
      if (move !== undefined) go(move[0], move[1]);
      else if (button.dataset.zoom === 'left') go(start - width / 2, end - width / 2);
      else if (button.dataset.zoom === 'right') go(start + width / 2, end + width / 2);
      else go(0, 100);
    });
  }
}
