import { useMutation, useQuery, type QueryKey, type UseMutationResult, type UseQueryResult } from '@tanstack/react-query';
import type { ParamsOf, QueryOf, RouteContract } from '@/shared/contracts/route';
import { callOnce } from './call-once';
import { call, type CallInput, type CallResult } from './client';
import { useLab } from './session';

type LabParams<R extends RouteContract> = Omit<ParamsOf<R>, 'labId'>;

interface LabQueryInput<R extends RouteContract> {
  params?: LabParams<R>;
  query?: QueryOf<R>;
  /** Ask again after so many ms while the page is seen; or what decides that of the last answer. */
  everyMs?: number | ((answer: CallResult<R> | undefined) => number | false);
  enabled?: boolean;
}

/** Keys begin with the lab, then the route: everything of one route is refreshed by `labKey(labId, route)`. */
export const labKey = (labId: string, route: RouteContract, input: { params?: unknown; query?: unknown } = {}): QueryKey => [
  labId,
  route.name,
  ...(input.params === undefined && input.query === undefined ? [] : [input.params ?? null, input.query ?? null]),
];

const withLab = <R extends RouteContract>(labId: string, params: LabParams<R> | undefined) =>
  ({ labId, ...params }) as unknown as ParamsOf<R>;

/** Reads a route of the present lab; `data` holds the body and the ETag. */
export function useLabQuery<R extends RouteContract>(route: R, input: LabQueryInput<R> = {}): UseQueryResult<CallResult<R>> {
  const { labId } = useLab();
  const { everyMs = false } = input;
  return useQuery({
    queryKey: [...labKey(labId, route), input.params ?? null, input.query ?? null],
    queryFn: ({ signal }) => call(route, { params: withLab<R>(labId, input.params), query: input.query, signal }),
    refetchInterval: typeof everyMs === 'function' ? ({ state }) => everyMs(state.data) : everyMs,
    enabled: input.enabled ?? true,
  });
}

type LabCallInput<R extends RouteContract> = Omit<CallInput<R>, 'params'> & { params?: LabParams<R> };

/** A function that calls a route of the present lab. */
export function useLabCall<R extends RouteContract>(route: R): (input?: LabCallInput<R>) => Promise<CallResult<R>> {
  const { labId } = useLab();
  return (input = {}) => call(route, { ...input, params: withLab<R>(labId, input.params) } as CallInput<R>);
}

/** An act of the present lab that lets masses move: sent once, and waited for as long as it counts. */
export function useLabOnce<R extends RouteContract>(
  route: R,
  after: (result: CallResult<R>) => void,
): UseMutationResult<CallResult<R>, Error, LabCallInput<R>> {
  const { labId } = useLab();
  const mutationFn = (input: LabCallInput<R>) => callOnce(route, { ...input, params: withLab<R>(labId, input.params) } as CallInput<R>);
  return useMutation({ mutationFn, onSuccess: after });
}

/** A change through a route of the present lab. Never tried again by itself. */
export function useLabMutation<R extends RouteContract>(
  route: R,
  after?: (result: CallResult<R>) => void,
): UseMutationResult<CallResult<R>, Error, LabCallInput<R>> {
  const send = useLabCall(route);
  return useMutation({ mutationFn: (input: LabCallInput<R>) => send(input), onSuccess: (result) => after?.(result) });
}
