/**
 * html: the result as one page that works offline.
 *
 * In: a Result, and the page's program (client/, bundled by the build). Out: a string, a whole HTML document.
 * Its one decision: everything stands in the page as text and tables without the program; the program only draws the charts from
 * the numbers of data.ts, sorts and zooms. So nothing is lost to a screen reader, a printer or a browser without scripts.
 * Not modelled: no figure is computed here but ratios of two figures of the document.
 */
import type { Result } from '../../analysis/result-schema.js';
import { CAUTION } from '../caution.js';
import { plain } from '../style.js';
import { pageData } from './data.js';
import { page } from './page.js';
import { bankSection } from './sections/banks.js';
import { kernelSection, rooflineSection } from './sections/kernels.js';
import { delaySection, latencySection } from './sections/latency.js';
import { packageSection, provenanceSection } from './sections/package.js';
import { stackSection } from './sections/stack.js';
import { timeSection } from './sections/time.js';
import { head, headline } from './sections/top.js';

/** The HTML report. `client` is the page's program: the text of the bundle that the build makes of client/main.ts. */
export function htmlReport(result: Result, client: string): string {
  const data = pageData(result);
  const { package: pkg, provenance } = result;
  return page(
    {
      title: `${plain(pkg.name)}, ${plain(provenance.trace_file)}: penstock`,
      contents: [
        ['figures', 'Figures'],
        ['stack', 'Clocks'],
        ['time', 'Time'],
        ['latency', 'Latency'],
        ['roofline', 'Roofline'],
        ['kernels', 'Kernels'],
        ['banks', 'Banks'],
        ['package', 'Package'],
        ['provenance', 'Provenance'],
      ],
      top: head(result),
      body: [
        headline(result),
        stackSection(result),
        timeSection(result, data),
        latencySection(result),
        delaySection(result),
        rooflineSection(result, data.roofline),
        kernelSection(result),
        bankSection(result, data.banks),
        packageSection(result),
        provenanceSection(result),
      ],
      foot: pkg.caution === '' ? CAUTION : `${CAUTION} ${pkg.caution}`,
      data,
    },
    client,
  );
}
