import { CAUTION, PROVES, reportEntries, reportFacts } from './facts';
import type { Evidence, Making } from './gather';

const escaped = (text: string): string => text.replace(/[&<>"']/g, (c) => `&#${c.charCodeAt(0)};`);

const STYLE = `body{font:16px/1.5 system-ui,sans-serif;max-width:60rem;margin:2rem auto;padding:0 1rem;color:#15211f;background:#fff}
h1,h2{line-height:1.2}dl{display:grid;grid-template-columns:max-content 1fr;gap:.3rem 1.5rem}dt{color:#54605c}dd{margin:0;overflow-wrap:anywhere}
table{border-collapse:collapse;width:100%}th,td{text-align:left;vertical-align:top;padding:.4rem .6rem;border-bottom:1px solid #dad5c8;overflow-wrap:anywhere}
td:first-child{font-variant-numeric:tabular-nums}`;

/** The report as one page without scripts, pictures or addresses: it opens from the package's folder anywhere. */
export function htmlReport(evidence: Evidence, making: Making): string {
  const facts = reportFacts(evidence, making)
    .map(([term, value]) => `<dt>${escaped(term)}</dt><dd>${escaped(value)}</dd>`)
    .join('\n');
  const rows = reportEntries(evidence)
    .map(
      (entry) =>
        `<tr><td>${entry.sequence}</td><td>${escaped(entry.at)}</td><td>${escaped(entry.what)}</td><td>${escaped(entry.who)}</td><td>${escaped(entry.detail)}</td></tr>`,
    )
    .join('\n');
  return `<!doctype html>
<html lang="en">
<meta charset="utf-8">
<meta http-equiv="content-security-policy" content="default-src 'none'; style-src 'unsafe-inline'">
<title>Custody of ${escaped(evidence.number)}</title>
<style>${STYLE}</style>
<h1>Custody of ${escaped(evidence.number)}</h1>
<p>${escaped(PROVES)}</p>
<dl>
${facts}
</dl>
<h2>Entries</h2>
<table>
<thead><tr><th scope="col">Entry</th><th scope="col">When (UTC)</th><th scope="col">What happened</th><th scope="col">Who</th><th scope="col">Detail</th></tr></thead>
<tbody>
${rows}
</tbody>
</table>
<p>${escaped(CAUTION)}</p>
</html>
`;
}
