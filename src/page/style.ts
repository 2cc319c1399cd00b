/** The style sheet of the page: one column, grey at rest, colour for the abnormal alone. */
export const styleCss = `
:root {
  --ground: #fbfaf7; --ink: #24262a; --soft: #5d6168; --faint: #d9d7d1; --shade: #ecebe6; --line: #6b6f76;
  --strain: #8a5a00; --shift: #a8201a;
  --serif: "Iowan Old Style", "Palatino Linotype", Palatino, "Source Serif 4", Georgia, "DejaVu Serif", serif;
  --sans: system-ui, -apple-system, "Segoe UI", "Helvetica Neue", "DejaVu Sans", sans-serif;
}
@media (prefers-color-scheme: dark) {
  :root {
    --ground: #17181a; --ink: #dcdbd6; --soft: #a0a29f; --faint: #34363a; --shade: #232528; --line: #9a9c98;
    --strain: #e0b055; --shift: #ff8d80;
  }
}
* { box-sizing: border-box; }
[hidden] { display: none !important; }
html { background: var(--ground); color: var(--ink); scroll-padding-top: 4rem; }
body { margin: 0; font: 1.0625rem/1.5 var(--serif); overflow-wrap: anywhere; }
#page, .login { max-width: 52rem; margin: 0 auto; padding: 1.5rem 1.25rem 3rem; }
h1, h2, h3, p, ul, ol { margin: 0; }
h1 { font-size: 1.125rem; font-weight: 600; letter-spacing: 0.02em; }
h2 { font-size: 1.375rem; font-weight: 600; line-height: 1.25; margin-bottom: 0.25rem; }
h3 { font: 600 0.8125rem/1.4 var(--sans); color: var(--soft); margin-bottom: 0.25rem; }
a { color: inherit; text-decoration-color: var(--faint); text-underline-offset: 0.2em; }
a:hover { text-decoration-color: currentColor; }
:focus-visible { outline: 2px solid var(--ink); outline-offset: 2px; }
small, .quiet, .axis, .scale, .bars, footer { font-family: var(--sans); font-size: 0.8125rem; color: var(--soft); }
.quiet, .bars, .value, .scale, .axis { font-variant-numeric: tabular-nums; }
.plain, .overview, .alerts, .bars { list-style: none; padding: 0; }
section { margin-top: 2.25rem; }
section p + p { margin-top: 0.25rem; }

.banner { position: sticky; top: 0; z-index: 1; margin: -0.5rem 0 1rem; padding: 0.6rem 0.9rem;
  background: var(--ink); color: var(--ground); font: 600 0.9375rem/1.4 var(--sans); }
.lost main { opacity: 0.55; }

.overview li { padding: 0.7rem 0; border-top: 1px solid var(--faint); }
.overview li:last-child { border-bottom: 1px solid var(--faint); }
.overview .head { display: flex; flex-wrap: wrap; align-items: center; gap: 0 0.6rem; }
.overview .head a { font-weight: 600; }
.overview .head span { font-family: var(--sans); font-size: 0.8125rem; color: var(--soft); font-variant-numeric: tabular-nums; }
strong { font-weight: 600; }
.shape { width: 2rem; height: 1.25rem; flex: none; vertical-align: -0.2em; }
.shape path { fill: none; stroke: currentColor; stroke-width: 2.5; stroke-linecap: round; }
.learning .shape, .steady .shape, .learning strong, .steady strong { color: var(--soft); }
.straining .shape, .straining h2 strong, .straining .head strong { color: var(--strain); }
.shifted .shape, .shifted h2 strong, .shifted .head strong { color: var(--shift); }
h2 .shape { margin-left: 0.25rem; }

.strips { margin-top: 0.9rem; }
.strip { display: grid; grid-template-columns: 14.5rem minmax(0, 1fr) 3.25rem; column-gap: 0.75rem; border-top: 1px solid var(--faint); }
.strip .label { margin: 0; padding: 0.3rem 0; font: 0.8125rem/1.35 var(--sans); display: flex; flex-wrap: wrap; align-content: flex-start; justify-content: space-between; column-gap: 0.5rem; }
.strip .label small { flex-basis: 100%; font-size: 0.75rem; }
.strip .value { font-weight: 600; }
.strip svg { display: block; width: 100%; height: 3.75rem; overflow: hidden; }
.strip path { fill: none; stroke: var(--line); stroke-width: 1.5; stroke-linejoin: round; vector-effect: non-scaling-stroke; }
.strip path.main { stroke: var(--ink); }
.strip path.second { stroke: var(--line); stroke-width: 1; }
.strip path.dashed { stroke-width: 1; stroke-dasharray: 4 3; }
.strip path.shade { fill: var(--shade); stroke: none; }
.strip path.mark { stroke: var(--shift); stroke-width: 1; }
.strip path.begun { stroke-dasharray: 2 2; }
.straining .strip:nth-last-child(2) path.main { stroke: var(--strain); }
.shifted .strip:nth-last-child(2) path.main { stroke: var(--shift); }
.strip .scale { margin: 0; padding: 0.1rem 0; font-size: 0.6875rem; display: flex; flex-direction: column; justify-content: space-between; }
.axis { display: flex; justify-content: space-between; gap: 1rem; border-top: 1px solid var(--faint); padding: 0.15rem 4rem 0 15.25rem; margin: 0; font-size: 0.75rem; }

.carriers { margin-top: 1rem; }
.bars li { display: grid; grid-template-columns: 14.5rem minmax(0, 1fr) 3.25rem; column-gap: 0.75rem; align-items: center; padding: 0.1rem 0; }
.bars .name { color: var(--ink); overflow: hidden; text-overflow: ellipsis; white-space: nowrap; }
.bars li > span:last-child { white-space: nowrap; }
.bars .track { display: block; height: 0.6rem; }
.bars .bar { display: block; height: 100%; min-width: 1px; background: var(--line); }
.bars .against { background: none; border: 1px solid var(--line); }
.shifted .bars .bar { background: var(--shift); }
.shifted .bars .against { background: none; border-color: var(--shift); }
.bars .rest .name { color: var(--soft); font-style: italic; }
.bars .rest .bar, .shifted .bars .rest .bar { background: var(--faint); }
.bars .rest .against, .shifted .bars .rest .against { background: none; border-color: var(--faint); }

details { margin-top: 0.75rem; }
summary { cursor: pointer; font: 0.8125rem/1.6 var(--sans); color: var(--soft); }
details p, details li { font-size: 0.9375rem; }
details p { margin-top: 0.35rem; }
.alerts li.alert { padding: 0.7rem 0; border-top: 1px solid var(--faint); }
.alert.standing > p > strong { color: var(--shift); }
.alert.over, .alert.withheld > p > strong { color: var(--soft); }
.cautions { margin-top: 0.5rem; color: var(--soft); }
.feeds .unwell { font-weight: 600; color: var(--strain); }
.feeds li { font-variant-numeric: tabular-nums; }
footer { margin-top: 3rem; padding-top: 0.75rem; border-top: 1px solid var(--faint); }
footer p { margin-top: 0.5rem; }
input, button { font: inherit; color: inherit; background: var(--ground); border: 1px solid var(--line); padding: 0.3rem 0.6rem; }

@media (max-width: 40rem) {
  #page, .login { padding: 1rem 1rem 2.5rem; }
  .strip { grid-template-columns: minmax(0, 1fr) 2.5rem; }
  .strip .label { grid-column: 1 / -1; padding: 0.3rem 0 0; }
  .axis { padding: 0.15rem 3.25rem 0 0; }
  .bars li { grid-template-columns: minmax(0, 8rem) minmax(0, 1fr) 3.25rem; }
}
@media (prefers-reduced-motion: no-preference) { html { scroll-behavior: smooth; } }
`
