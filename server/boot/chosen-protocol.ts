import { readFileSync } from 'node:fs';
import { checkDocumentText } from '@/shared/protocol/check';
import type { ProtocolDocument } from '@/shared/protocol/document';
import type { Finding } from '@/shared/protocol/finding';
import { templateById, templates } from '@/shared/protocol/templates';
import { checkRigText } from '@/shared/rig/check';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import type { RigDocument } from '@/shared/rig/document';

/** What the commands have in common: a protocol from a file or a template, and the rig it is meant for. */

/** Input that cannot be used; the message is for the person who gave it. */
export class Unusable extends Error {}

export function listed(findings: readonly Finding[]): string {
  return findings.map(({ code, path, message }) => `  ${path === null ? '' : `${path}: `}${message} [${code}]`).join('\n');
}

export interface Choice {
  document: ProtocolDocument;
  rig: RigDocument;
}

export interface ChoiceArguments {
  positionals: readonly string[];
  template: string | undefined;
  rig: string | undefined;
  usage: string;
}

/**
 * The protocol and rig that were asked for.
 * @throws Unusable
 */
export function chosenProtocol({ positionals, template, rig: rigFile, usage }: ChoiceArguments): Choice {
  const rig = rigFile === undefined ? demoRigWide : readRig(rigFile);
  const [file, ...others] = positionals;
  if (others.length > 0) throw new Unusable(`One protocol at a time: ${positionals.join(', ')} were given.\n${usage}`);
  if ((file === undefined) === (template === undefined)) {
    throw new Unusable(
      `${file === undefined ? 'No protocol was given' : 'Both a file and a template were given'}; one of the two is needed.\n${usage}`,
    );
  }
  if (template !== undefined) return fromTemplate(template, rig);
  return { document: readProtocol(file as string), rig };
}

function fromTemplate(id: string, rig: RigDocument): Choice {
  const template = templateById(id);
  if (template !== undefined) return { document: template.make(rig), rig: template.rigFor(rig) };
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
