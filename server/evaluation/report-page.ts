import { readFileSync } from 'node:fs';
import PDFDocument from 'pdfkit';

/** A4 pages with headings, lines, tables and plain plots. Lengths in points. */

const margin = 56;
const plotPt = 130;
/** Room that a plot takes, its words included. */
export const wholePlotPt = plotPt + 40;
const fontFiles = {
  plain: require.resolve('dejavu-fonts-ttf/ttf/DejaVuSans.ttf'),
  strong: require.resolve('dejavu-fonts-ttf/ttf/DejaVuSans-Bold.ttf'),
};

export interface PlotPoint {
  x: number;
  y: number;
  u: number;
  far: boolean;
}

export interface Plot {
  points: readonly PlotPoint[];
  xWords: string;
  yWords: string;
  /** Words at a value of y. */
  format: (y: number) => string;
}

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

  private room(height: number): void {
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

  /** Points with ± u over x; near as discs, far as rings. */
  plot({ points, xWords, yWords, format }: Plot): void {
    if (points.length === 0) return;
    this.room(wholePlotPt);
    const { document } = this;
    const [left, top] = [margin + 60, document.y + 14];
    const width = this.width - 70;
    const xs = points.map(({ x }) => x);
    const low = Math.min(...points.map(({ y, u }) => y - u));
    const high = Math.max(...points.map(({ y, u }) => y + u));
    const [fromX, toX] = [Math.min(...xs), Math.max(...xs)];
    const px = (x: number) => left + (toX === fromX ? 0.5 : (x - fromX) / (toX - fromX)) * width;
    const py = (y: number) => top + plotPt - (high === low ? 0.5 : (y - low) / (high - low)) * plotPt;
    document
      .lineWidth(0.5)
      .strokeColor('#555555')
      .rect(left - 8, top - 4, width + 16, plotPt + 8)
      .stroke();
    for (const { x, y, u, far } of points) {
      document
        .strokeColor('#000000')
        .moveTo(px(x), py(y - u))
        .lineTo(px(x), py(y + u))
        .stroke();
      document.circle(px(x), py(y), 2.2);
      if (far) document.fillAndStroke('#ffffff', '#000000');
      else document.fillAndStroke('#000000', '#000000');
    }
    document.fillColor('#000000').font('plain').fontSize(8);
    for (const y of [low, (low + high) / 2, high]) document.text(format(y), margin, py(y) - 4, { width: 48, align: 'right' });
    document.text(yWords, margin, top - 16, { width: this.width });
    document.text(xWords, left, top + plotPt + 8, { width, align: 'right' });
    document.x = margin;
    document.moveDown(0.5);
  }

  end(): Promise<Uint8Array> {
    this.document.end();
    return this.whole;
  }
}
