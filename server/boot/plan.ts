import { readFileSync } from 'node:fs';
import { parseArgs } from 'node:util';
import { NotYetError } from '@/shared/lib/not-yet-error';
import { adviseProtocol } from '@/shared/protocol/advise';
import { checkDocumentText, checkProtocol } from '@/shared/protocol/check';
import type { ProtocolDocument } from '@/shared/protocol/document';
import type { Finding } from '@/shared/protocol/finding';
import { predictSignal } from '@/shared/protocol/predict';
import { templateById, templates, templatesNotYet } from '@/shared/protocol/templates';
import { planTimeline } from '@/shared/protocol/timeline';
import { checkRigText } from '@/shared/rig/check';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import type { RigDocument } from '@/shared/rig/document';

/** `npm run -s plan -- (PROTOCOL.json | --template NAME) [--rig RIG.json]`: what a protocol takes and gives on a rig. */

const usage = 'Usage: npm run -s plan -- (PROTOCOL.json | --template NAME) [--rig RIG.json]';

/** A plan is made as if begun at this instant, homed, in UTC. */
const startUtcMs = Date.UTC(2000, 0, 1);

export interface Plan {
  duration_s: number;
  /** Near minus far, rad; null where the rig does not tell. */
  signal_rad: number | null;
  /** The same on the scale, m. */
  signal_m: number | null;
  relativeU: null;
  u_by_source: null;
  advice: Finding[];
  bestDwell_s: null;
  peakExcursion_rad: null;
  alternatives: null;
}

/** Input that cannot be planned; the message is for the person who gave it. */
class Unusable extends Error {}

/**
 * Plans a document on a rig.
 * @throws Unusable for a protocol that is refused, NotYetError for a rig whose torque cannot be computed yet.
 */
export function makePlan(document: ProtocolDocument, rig: RigDocument): Plan {
  const start = { utcMs: startUtcMs, angleDeg: rig.motion?.homeDeg ?? 0 };
  const refusals = checkProtocol(document, rig, start);
  if (refusals.length > 0) throw new Unusable(`The protocol "${document.name}" is refused:\n${listed(refusals)}`);
  const timeline = planTimeline({ protocol: document, rig, timeZone: 'UTC' }, start);
  if (timeline.truncated) throw new Unusable(`The protocol "${document.name}" would execute more than 10,000 steps.`);
  const signal = predictSignal(rig);
  return {
    duration_s: Math.round(timeline.durationS * 1e6) / 1e6,
    signal_rad: signal?.signalRad ?? null,
    signal_m: signal?.signalM ?? null,
    relativeU: null,
    u_by_source: null,
    advice: adviseProtocol(document, rig, start),
    bestDwell_s: null,
    peakExcursion_rad: null,
    alternatives: null,
  };
}

function listed(findings: readonly Finding[]): string {
  return findings.map(({ code, path, message }) => `  ${path === null ? '' : `${path}: `}${message} [${code}]`).join('\n');
}

interface Choice {
  document: ProtocolDocument;
  rig: RigDocument;
}

function chosen(args: readonly string[]): Choice {
  const { values, positionals } = parsedArguments(args);
  const rig = values.rig === undefined ? demoRigWide : readRig(values.rig);
  const [file, ...others] = positionals;
  if (others.length > 0) throw new Unusable(`One protocol at a time: ${positionals.join(', ')} were given.\n${usage}`);
  if ((file === undefined) === (values.template === undefined)) {
    throw new Unusable(`${file === undefined ? 'No protocol was given' : 'Both a file and a template were given'}; one of the two is needed.\n${usage}`);
  }
  if (values.template !== undefined) return fromTemplate(values.template, rig);
  return { document: readProtocol(file as string), rig };
}

function parsedArguments(args: readonly string[]) {
  try {
    return parseArgs({ args: [...args], options: { template: { type: 'string' }, rig: { type: 'string' } }, allowPositionals: true });
  } catch (error) {
    throw new Unusable(`${error instanceof Error ? error.message : String(error)}\n${usage}`);
  }
}

function fromTemplate(id: string, rig: RigDocument): Choice {
  const template = templateById(id);
  if (template !== undefined) return { document: template.make(rig), rig: template.rigFor(rig) };
  if (templatesNotYet.includes(id)) throw new NotYetError(`The template "${id}" needs steps that are not built yet. Built are: ${templates.map((each) => each.id).join(', ')}.`);
  throw new Unusable(`There is no template "${id}". There are: ${templates.map((each) => each.id).join(', ')}.`);
}

function readText(path: string): string {
  try {
    return readFileSync(path, 'utf8');
  } catch (error) {
    throw new Unusable(`${path} cannot be read: ${error instanceof Error ? error.message : String(error)}`);
  }
}

function readProtocol(path: string): ProtocolDocument {
  const { document, findings } = checkDocumentText(readText(path));
  if (document === null) throw new Unusable(`${path} is no protocol that can be used:\n${listed(findings)}`);
  return document;
}

function readRig(path: string): RigDocument {
  const { rig, findings } = checkRigText(readText(path));
  if (rig === null) throw new Unusable(`${path} is no rig that can be used:\n${listed(findings)}`);
  return rig;
}

export interface Output {
  out: (text: string) => void;
  err: (text: string) => void;
}

const toProcess: Output = { out: (text) => process.stdout.write(text), err: (text) => process.stderr.write(text) };

/** The command: one JSON object on `out` and 0, or a message on `err` and 2. `args` are those after the command's name. */
export function main(args: readonly string[], output: Output = toProcess): number {
  try {
    const { document, rig } = chosen(args);
    output.out(`${JSON.stringify(makePlan(document, rig), null, 2)}\n`);
    return 0;
  } catch (error) {
    if (error instanceof NotYetError) output.err(`plan: ${error.message} [${error.code}]\n`);
    else if (error instanceof Unusable) output.err(`plan: ${error.message}\n`);
    else throw error;
    return 2;
  }
}

if (require.main === module) process.exitCode = main(process.argv.slice(2));
