/** Counts of answered requests, and the text form of Prometheus (exposition format 0.0.4). */

/** Upper edges of the times of answers, s. */
const edgesS = [0.01, 0.05, 0.1, 0.25, 0.5, 1, 2.5, 5] as const;

interface Route {
  count: number;
  sumS: number;
  below: number[];
}

/** Answers by method and kind of status. */
export class AnswerCounts {
  private readonly byKind = new Map<string, Route>();

  answered({ method, status, ms }: { method: string; status: number; ms: number }): void {
    const kind = `${method} ${String(Math.floor(status / 100))}xx`;
    const seen = this.byKind.get(kind) ?? { count: 0, sumS: 0, below: edgesS.map(() => 0) };
    seen.count += 1;
    seen.sumS += ms / 1000;
    edgesS.forEach((edge, index) => {
      if (ms / 1000 <= edge) seen.below[index] = (seen.below[index] ?? 0) + 1;
    });
    this.byKind.set(kind, seen);
  }

  metrics(): Metric[] {
    const name = 'evenfall_http_answer_seconds';
    const samples = [...this.byKind].flatMap(([kind, { count, sumS, below }]) => {
      const [method = '', status = ''] = kind.split(' ');
      const labels = { method, status };
      return [
        ...edgesS.map((edge, index): Sample => ({
          name: `${name}_bucket`,
          labels: { ...labels, le: String(edge) },
          value: below[index] ?? 0,
        })),
        { name: `${name}_bucket`, labels: { ...labels, le: '+Inf' }, value: count },
        { name: `${name}_sum`, labels, value: sumS },
        { name: `${name}_count`, labels, value: count },
      ];
    });
    return [{ name, type: 'histogram', help: 'Time until a request of the API was answered.', samples }];
  }
}

export interface Sample {
  /** Where it is not that of the metric. */
  name?: string;
  labels?: Readonly<Record<string, string>>;
  value: number;
}

export interface Metric {
  name: string;
  type: 'gauge' | 'counter' | 'histogram';
  help: string;
  samples: readonly Sample[];
}

export const gauge = (name: string, help: string, value: number): Metric => ({ name, type: 'gauge', help, samples: [{ value }] });

const escaped = (text: string) => text.replaceAll('\\', '\\\\').replaceAll('\n', '\\n').replaceAll('"', '\\"');

/** Metrics as Prometheus reads them. */
export function metricsText(metrics: readonly Metric[]): string {
  return metrics
    .map(({ name, type, help, samples }) => {
      const lines = samples.map(({ name: own = name, labels = {}, value }) => {
        const pairs = Object.entries(labels).map(([label, text]) => `${label}="${escaped(text)}"`);
        return `${own}${pairs.length === 0 ? '' : `{${pairs.join(',')}}`} ${String(value)}`;
      });
      return [`# HELP ${name} ${help}`, `# TYPE ${name} ${type}`, ...lines, ''].join('\n');
    })
    .join('');
}
