import { readFileSync } from 'node:fs';
import PDFDocument from 'pdfkit';
import { drawPlot, plotRoomPt, type Plot } from './report-plot';

/** A4 pages with headings, lines, tables and plain plots. Lengths in points. */

const margin = 56;
const plotPt = 120;
/** Room that a plot of the usual height takes, its words included. */
export const wholePlotPt = plotRoomPt(plotPt);
const fontFiles = {
  plain: require.resolve('dejavu-fonts-ttf/ttf/DejaVuSans.ttf'),
  strong: require.resolve('dejavu-fonts-ttf/ttf/DejaVuSans-Bold.ttf'),
};

export class ReportPage {
  private readonly document: PDFKit.PDFDocument;
  private readonly whole: Promise<Uint8Array>;

  /** `dated`: what the file says of when it was made. `compress` false leaves the text readable for tests. */
  constructor({ title, dated, compress = true }: { title: string; dated: Date; compress?: boolean }) {
    this.document = new PDFDocument({
      size: 'A4',
      margin,
      compress,
      info: { Title: title, Creator: 'Evenfall', Producer: 'Evenfall', CreationDate: dated, ModDate: dated },
    });
    const chunks: Buffer[] = [];
    this.whole = new Promise((resolve, reject) => {
      this.document.on('data', (chunk: Buffer) => chunks.push(chunk));
      this.document.on('end', () => resolve(new Uint8Array(Buffer.concat(chunks))));
      this.document.on('error', reject);
    });
    this.document.registerFont('plain', readFileSync(fontFiles.plain));
    this.document.registerFont('strong', readFileSync(fontFiles.strong));
  }

  private get width(): number {
    return this.document.page.width - 2 * margin;
  }

  /** What follows is so high and stays on one page. */
  room(height: number): void {
    if (this.document.y + height > this.document.page.height - margin) this.document.addPage();
  }

  title(text: string): void {
    this.document.font('strong').fontSize(18).text(text, margin, this.document.y, { width: this.width }).moveDown(0.3);
  }

  /** `following`: what must have room under it on the same page. */
  heading(text: string, following = 40): void {
    this.room(20 + following);
    this.document
      .font('strong')
      .fontSize(12)
      .text(text, margin, this.document.y + 12, { width: this.width })
      .moveDown(0.3);
  }

  line(text: string, { strong = false, size = 9 } = {}): void {
    this.document
      .font(strong ? 'strong' : 'plain')
      .fontSize(size)
      .text(text, margin, this.document.y, { width: this.width, lineGap: 2 });
  }

  /** Rows of cells; `shares` of the width for each column. */
  table(rows: readonly (readonly string[])[], shares: readonly number[]): void {
    const widths = shares.map((share) => share * this.width - 6);
    rows.forEach((cells, index) => {
      this.document.font(index === 0 ? 'strong' : 'plain').fontSize(8);
      const height = Math.max(...cells.map((text, k) => this.document.heightOfString(text, { width: widths[k] ?? 0 }))) + 4;
      this.room(height);
      const top = this.document.y;
      let x = margin;
      cells.forEach((text, k) => {
        this.document.text(text, x, top, { width: widths[k] ?? 0 });
        x += (shares[k] ?? 0) * this.width;
      });
      this.document.y = top + height;
      this.document
        .moveTo(margin, top + height - 3)
        .lineTo(margin + this.width, top + height - 3)
        .lineWidth(0.3)
        .strokeColor('#999999')
        .stroke();
    });
    this.document.x = margin;
  }

  /** `heightPt` of the frame. */
  plot(plot: Plot, heightPt = plotPt): void {
    if (plot.points.length === 0) return;
    this.room(plotRoomPt(heightPt));
    const { document } = this;
    const top = document.y;
    drawPlot(document, { x: margin, y: top, width: this.width, heightPt }, plot);
    document.x = margin;
    document.y = top + plotRoomPt(heightPt);
  }

  /** Shares from 0 to 1 as bars, each with its words before it and its figure behind. */
  bars(rows: readonly { words: string; share: number; figure: string }[]): void {
    const { document } = this;
    const [words, figure] = [0.34 * this.width, 0.12 * this.width];
    const most = this.width - words - figure - 12;
    for (const row of rows) {
      this.room(14);
      const top = document.y;
      document.fillColor('#000000').font('plain').fontSize(8);
      document.text(row.words, margin, top, { width: words, lineBreak: false });
      document.text(row.figure, margin + this.width - figure, top, { width: figure, align: 'right', lineBreak: false });
      document.rect(margin + words + 6, top + 1, Math.max(0.5, row.share * most), 7).fill('#444444');
      document.y = top + 13;
    }
    document.fillColor('#000000');
    document.x = margin;
    document.moveDown(0.5);
  }

  end(): Promise<Uint8Array> {
    this.document.end();
    return this.whole;
  }
}
