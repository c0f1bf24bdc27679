import type { RouteContract } from '@/shared/contracts/route';
import type { IdempotencyAnswer } from '@/server/interfaces/idempotency';
import type { RigQuestion } from '@/server/interfaces/process-post';
import { checkedResponse } from '../check-response';
import { invalidInput } from '../errors';
import { fieldWords } from '../field-words';
import type { MountedRoute, RouteContext } from '../route-context';
import type { Services } from '../services';
import type { AskedOfRig, RigDesk } from './rig-desk';

/** The desk of a process that drives rigs itself: the routes answer at once, out of its own memory. */
export class HereDesk implements RigDesk {
  private readonly routes: ReadonlyMap<string, MountedRoute>;

  constructor(
    routes: readonly MountedRoute[],
    private readonly services: () => Services,
  ) {
    this.routes = new Map(routes.map((route) => [route.contract.name, route]));
  }

  ask({ question }: Pick<AskedOfRig, 'question'>): Promise<IdempotencyAnswer> {
    return this.answer(question);
  }

  askEach(question: RigQuestion): Promise<IdempotencyAnswer> {
    return this.answer(question);
  }

  private async answer(question: RigQuestion): Promise<IdempotencyAnswer> {
    const route = this.routes.get(question.route);
    if (route === undefined) throw new Error(`nobody answers the route ${question.route} at the rig`);
    const { contract } = route;
    const services = this.services();
    const { params, ifMatch, key = null, me, membership } = question;
    let etag: string | null = null;
    const context = {
      ...{ params, ifMatch, key, me, membership, services },
      query: parsedBy(contract, 'query', question.query),
      body: parsedBy(contract, 'body', question.body),
      setEtag: (version: string) => {
        etag = version;
      },
    } as unknown as RouteContext;
    const value = await route.handle(context);
    const body = contract.response === undefined ? null : checkedResponse(contract.response, value, services);
    return { status: contract.status, body, etag };
  }
}

/** @throws ProblemError where a part of a request does not fit its schema */
export function parsedBy(contract: RouteContract, where: 'query' | 'body', value: unknown): unknown {
  const schema = contract[where];
  if (schema === undefined) return undefined;
  const result = schema.safeParse(value, { error: fieldWords });
  if (!result.success) throw invalidInput(where, result.error);
  return result.data;
}
