import { STACK_CLASSES, type StackClass } from '../../engine/recording.js';

/** A colour for paper and one for a dark screen. */
type Colour = readonly [light: string, dark: string];

/** Colours of the classes: data green, DRAM limits warm, starvation cool; neighbours differ in lightness too. */
const CLASS_COLOURS: Readonly<Record<StackClass, Colour>> = {
  read_data: ['#1d6b45', '#4fae7d'],
  write_data: ['#7db558', '#a5d27f'],
  refresh: ['#6e4420', '#a97a4e'],
  row_cycle: ['#c2403f', '#e36b66'],
  activate_window: ['#e39b2d', '#f0b657'],
  column_gap: ['#f0d079', '#f5df9f'],
  turnaround: ['#d9662b', '#ee8a55'],
  command_bus: ['#b67f8f', '#d3a3b0'],
  starved_down_link: ['#27548f', '#5b8fd1'],
  starved_up_link: ['#5f92d1', '#8db8ea'],
  starved_queue_credits: ['#a9c6e6', '#bfd8f2'],
  starved_window: ['#5a3f8a', '#9378c9'],
  starved_compute: ['#9d84c4', '#bba6dc'],
  starved_imbalance: ['#2f8d99', '#5cbac5'],
  starved_arrivals: ['#84929c', '#8b99a3'],
  starved_drain: ['#c6ced3', '#525e66'],
};

/** Stages of a read: dies and windows violet, down link blue, controller warm, data green, up link light blue. */
const STAGE_COLOURS: Readonly<Record<string, Colour>> = {
  window_wait: ['#5a3f8a', '#9378c9'],
  down_link_queue: ['#27548f', '#5b8fd1'],
  down_link_transit: ['#5f92d1', '#8db8ea'],
  controller_queue: ['#c2403f', '#e36b66'],
  bank_preparation: ['#e39b2d', '#f0b657'],
  data_transfer: ['#1d6b45', '#4fae7d'],
  up_link_queue: ['#2f8d99', '#5cbac5'],
  up_link_transit: ['#84929c', '#8b99a3'],
};

const THEME: Readonly<Record<string, Colour>> = {
  paper: ['#faf9f5', '#14191b'],
  sheet: ['#ffffff', '#1b2225'],
  ink: ['#1b2426', '#e4e9e8'],
  soft: ['#56646a', '#9fb0b4'],
  rule: ['#d9dcd6', '#334046'],
  accent: ['#0a5c63', '#6cc5c9'],
  room: ['#e6e8e2', '#2b3539'],
  alarm: ['#a3251f', '#ff8f86'],
  attained: ['#0a5c63', '#6cc5c9'],
  estimate: ['#b25a12', '#f0a35c'],
  // of the map of banks: on paper the most is darkest, on a dark screen brightest
  'heat-1': ['#8fc0bd', '#24606a'],
  'heat-2': ['#1f7078', '#5cb8bb'],
  'heat-3': ['#7d1d2c', '#ffd79a'],
};

function variables(which: 0 | 1): string {
  const all = { ...THEME, ...prefixed(CLASS_COLOURS), ...prefixed(STAGE_COLOURS) };
  return Object.entries(all)
    .map(([name, colours]) => `--${name}:${colours[which]};`)
    .join('');
}

function prefixed(colours: Readonly<Record<string, Colour>>): Record<string, Colour> {
  return Object.fromEntries(Object.entries(colours).map(([name, colour]) => [`c-${name}`, colour]));
}

const FILLS = [...STACK_CLASSES, ...Object.keys(STAGE_COLOURS)]
  .map((name) => `.f-${name}{fill:var(--c-${name})}`)
  .join('');

/** The page's style sheet. On paper the light colours hold whatever the screen had. */
export const STYLE = `
:root{color-scheme:light;${variables(0)}}
@media screen and (prefers-color-scheme:dark){:root:not([data-theme=light]){color-scheme:dark;${variables(1)}}}
@media screen{:root[data-theme=dark]{color-scheme:dark;${variables(1)}}}
${FILLS}
*{box-sizing:border-box}
html{scroll-behavior:smooth;scroll-padding-top:3.5rem}
@media (prefers-reduced-motion:reduce){html{scroll-behavior:auto}}
body{margin:0;background:var(--paper);color:var(--ink);font:16px/1.5 system-ui,-apple-system,"Segoe UI",Roboto,"Noto Sans",Arial,sans-serif}
header,main,footer{max-width:76rem;margin:0 auto;padding:0 1.5rem}
a{color:var(--accent)}
:focus-visible{outline:3px solid var(--accent);outline-offset:2px}
.skip{position:absolute;left:-99rem}
.skip:focus{left:1rem;top:.5rem;z-index:3;background:var(--sheet);padding:.5rem 1rem}
.hidden{position:absolute;width:1px;height:1px;overflow:hidden;clip-path:inset(50%);white-space:nowrap}
nav{position:sticky;top:0;z-index:2;display:flex;flex-wrap:wrap;gap:.25rem 1.5rem;align-items:center;justify-content:space-between;padding:.4rem 1.5rem;background:var(--sheet);border-bottom:1px solid var(--rule);font-size:.875rem}
nav ul{display:flex;flex-wrap:wrap;gap:.1rem 1.1rem;margin:0;padding:0;list-style:none}
nav a{text-decoration:none;padding:.2rem 0;display:inline-block}
nav a:hover{text-decoration:underline}
header{padding-top:1.75rem}
.what{margin:0;color:var(--soft);font-size:.9rem;overflow-wrap:anywhere}
h1{margin:.3rem 0 .6rem;font-size:1.45rem;line-height:1.35;font-weight:600;max-width:62ch;text-wrap:pretty}
.caution{margin:.4rem 0;color:var(--soft);font-size:.9rem;max-width:80ch}
.alarm{margin:.6rem 0;padding:.5rem .8rem;border:2px solid var(--alarm);color:var(--alarm);font-weight:600}
.bad{color:var(--alarm)}
section{margin:2.2rem 0;padding-top:1.1rem;border-top:2px solid var(--rule)}
#figures{border-top:0;margin-top:1rem;padding-top:0}
h2{margin:0 0 .2rem;font-size:1.15rem}
h3{margin:1.4rem 0 .3rem;font-size:.95rem}
.reading{margin:0 0 .7rem;color:var(--soft);max-width:90ch;overflow-wrap:anywhere}
.tiles{display:grid;grid-template-columns:repeat(3,1fr);gap:1px;margin:0;background:var(--rule);border:1px solid var(--rule)}
.tiles>div{background:var(--sheet);padding:.8rem 1rem .9rem}
.tiles dt{color:var(--soft);font-size:.85rem}
.tiles dd{margin:0}
.tiles strong{display:block;font-size:1.6rem;font-weight:600;line-height:1.25;font-variant-numeric:tabular-nums}
.tiles span{color:var(--soft);font-size:.85rem;overflow-wrap:anywhere}
.meter{display:block;width:100%;height:.4rem;margin:.25rem 0 .35rem}
.room{fill:var(--room)}.level{fill:var(--accent)}.mark{fill:var(--ink)}
.whole{display:block;width:100%;height:2.4rem;margin:.4rem 0 .6rem}
.whole rect{stroke:var(--paper);stroke-width:1;vector-effect:non-scaling-stroke}
.plot{width:100%;position:relative}
.plot.mid{height:22rem}.plot.tall{height:34rem}.plot.rows{min-height:8rem}.plot.map{height:36rem}
.tip{font-size:.8rem;line-height:1.45;font-variant-numeric:tabular-nums}
.tip b{display:block;font-weight:600}
.tip div{display:flex;gap:1.2rem;justify-content:space-between}
.legend,.tools{display:flex;flex-wrap:wrap;gap:.3rem .5rem;align-items:center;margin:.4rem 0;font-size:.85rem}
.tools span,.tools output{color:var(--soft)}
button,select{font:inherit;color:inherit;background:var(--sheet);border:1px solid var(--rule);border-radius:3px;padding:.15rem .55rem;cursor:pointer}
button:hover,select:hover{border-color:var(--accent)}
.legend button{display:inline-flex;gap:.4rem;align-items:center;border-color:transparent;background:none;padding:.1rem .35rem}
.legend button[aria-pressed=false]{color:var(--soft);text-decoration:line-through}
.legend button[aria-pressed=false] svg{opacity:.25}
.legend svg{width:.8rem;height:.8rem;flex:none}
.two{display:grid;grid-template-columns:repeat(auto-fit,minmax(min(100%,27rem),1fr));gap:0 2.5rem}
details{margin:.5rem 0}
summary{cursor:pointer;color:var(--accent);font-size:.9rem;width:fit-content}
.scroll{overflow:auto;max-height:40rem;margin:.4rem 0 1rem;border-block:1px solid var(--rule);background:var(--sheet)}
table{border-collapse:separate;border-spacing:0;width:100%;font-size:.85rem;font-variant-numeric:tabular-nums}
caption{text-align:left;color:var(--soft);padding:.35rem .6rem;font-size:.85rem}
th,td{padding:.25rem .6rem;text-align:right;border-top:1px solid var(--rule);white-space:nowrap}
thead th{position:sticky;top:0;background:var(--sheet);font-weight:600;border-top:0;box-shadow:0 1px var(--rule);vertical-align:bottom;z-index:1}
th.t,td.t,tbody th{text-align:left}
tbody th{font-weight:500}
td.t:last-child{white-space:normal;min-width:14rem}
tbody tr:hover{background:var(--room)}
.two td.t:last-child{min-width:0}
.two td:nth-child(2){width:38%;min-width:6rem}
.bar{display:block;width:100%;height:.75rem}
.sortable thead th{padding:0}
.sortable thead th{border-bottom:0}
.sortable caption{position:absolute;clip-path:inset(50%);width:1px;height:1px;overflow:hidden;padding:0}
.sortable thead button{width:100%;border:0;border-radius:0;padding:.3rem .6rem;text-align:inherit;font-weight:600;background:none;white-space:nowrap}
.sortable thead button span::after{content:"\\2195";opacity:.35;padding-left:.3rem}
.sortable th[aria-sort=ascending] button span::after{content:"\\2191";opacity:1}
.sortable th[aria-sort=descending] button span::after{content:"\\2193";opacity:1}
#kernel-table tbody th{position:sticky;left:0;background:var(--sheet)}
.pairs{display:grid;gap:.3rem;margin:.6rem 0;font-size:.9rem}
.pairs>div{display:grid;grid-template-columns:9rem 1fr;gap:1rem}
.pairs dt{color:var(--soft)}
.pairs dd{margin:0;overflow-wrap:anywhere}
code{font:.85em ui-monospace,"SFMono-Regular",Menlo,Consolas,monospace;overflow-wrap:anywhere}
footer{padding-block:1rem 3rem;color:var(--soft);font-size:.85rem}
@media (max-width:60rem){.tiles{grid-template-columns:repeat(2,1fr)}}
@media (max-width:32rem){.tiles{grid-template-columns:1fr}}
@media (max-width:50rem){.pairs>div{grid-template-columns:1fr;gap:0}header,main,footer{padding-inline:1rem}}
@media print{
@page{margin:14mm}
nav,.skip,.tools button,.tools select,noscript{display:none}
body{font-size:10pt}
header,main,footer{max-width:none;padding-inline:0}
section{break-inside:auto}
h2,h3,.reading{break-after:avoid}
.plot,.whole,.tiles,tr{break-inside:avoid}
details:not([open]){display:none}
.scroll{overflow:visible;max-height:none}
table{font-size:7.5pt}
th,td{padding:.1rem .25rem}
.sortable{font-size:5.6pt}
.sortable tbody th{overflow-wrap:anywhere}
.sortable th,.sortable td,.sortable thead button,td.t:last-child{white-space:normal;min-width:0}
.sortable th,.sortable td,.sortable thead button{padding:.1rem .15rem}
.sortable thead button span::after{content:none}
thead th,#kernel-table tbody th{position:static}
.f-x,rect{print-color-adjust:exact;-webkit-print-color-adjust:exact}
}
`;
