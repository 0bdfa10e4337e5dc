import PDFDocument from 'pdfkit';
import { CAUTION, PROVES, reportEntries, reportFacts } from './facts';
import type { Evidence, Making } from './gather';

// The page's own fonts are variable ones in WOFF2, which the library cannot embed: the standard fonts of PDF are used.
const TEXT = 'Helvetica';
const STRONG = 'Helvetica-Bold';

/** Letters beyond what the standard fonts hold (WinAnsi) are shown as a question mark; report.html has them whole. */
const drawable = (text: string): string => text.replace(/[^\n\u0020-\u007e\u00a0-\u00ff–—‘’“”•…€]/gu, '?');

/** The report as PDF, A4. */
export async function pdfReport(evidence: Evidence, making: Making): Promise<Buffer> {
  const document = new PDFDocument({
    size: 'A4',
    margin: 50,
    lang: 'en',
    displayTitle: true,
    info: {
      Title: `Custody of ${evidence.number}`,
      Creator: 'Bellkeep',
      Producer: 'Bellkeep',
      CreationDate: new Date(making.madeAt),
    },
  });
  const pieces: Buffer[] = [];
  document.on('data', (piece: Buffer) => pieces.push(piece));
  const ended = new Promise<void>((resolve, reject) => {
    document.on('end', resolve);
    document.on('error', reject);
  });
  document.font(STRONG).fontSize(20).text(`Custody of ${evidence.number}`);
  document.moveDown(0.5).font(TEXT).fontSize(10).text(PROVES).moveDown();
  for (const [term, value] of reportFacts(evidence, making))
    document.font(STRONG).text(`${term}: `, { continued: true }).font(TEXT).text(drawable(value));
  document.moveDown().font(STRONG).fontSize(14).text('Entries').fontSize(9);
  for (const entry of reportEntries(evidence)) {
    document.moveDown(0.5);
    document.font(STRONG).text(`${entry.sequence}  ${entry.what}`, { continued: true });
    document.font(TEXT).text(`   ${entry.at}   ${drawable(entry.who)}`);
    if (entry.detail !== '') document.text(drawable(entry.detail), { indent: 12 });
  }
  document.moveDown(1.5).fontSize(9).text(CAUTION);
  document.end();
  await ended;
  return Buffer.concat(pieces);
}
