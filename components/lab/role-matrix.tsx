import { useLab } from '@/components/api';
import { Icon, Panel } from '@/components/ui';
import { roles } from '@/shared/contracts/roles';
import { matrixRows, roleSummary } from './role-words';

const short: Record<(typeof roles)[number], string> = { owner: 'Ow', keeper: 'Ke', operator: 'Op', analyst: 'An', viewer: 'Vi' };

/** Who may do what, the own role set off: a real table, so that it is read out with its headings. */
export function RoleMatrix() {
  const { role: own } = useLab();
  return (
    <Panel className="px-3">
      <table className="w-full border-collapse font-sans text-13 text-text">
        <caption className="pb-2 text-left text-dim">
          Your role is {own}: {roleSummary[own]}.
        </caption>
        <thead>
          <tr>
            <td />
            {roles.map((role) => (
              <th key={role} scope="col" className={`px-1 pb-2 text-center font-medium ${role === own ? 'text-lamp' : 'text-dim'}`}>
                <abbr title={role} aria-label={role} className="no-underline">
                  {short[role]}
                </abbr>
              </th>
            ))}
          </tr>
        </thead>
        <tbody>
          {matrixRows.map((row) => (
            <tr key={row.act} className="border-t border-line">
              <th scope="row" className="py-2 pr-2 text-left font-regular">
                {row.words}
              </th>
              {row.allowed.map((ok, index) => (
                <td key={roles[index]} className="px-1 py-2">
                  <span className="flex justify-center">
                    {ok ? (
                      <Icon name="tick" size={16} tone={roles[index] === own ? 'lamp' : 'dim'} label="yes" />
                    ) : (
                      <span className="sr-only">no</span>
                    )}
                  </span>
                </td>
              ))}
            </tr>
          ))}
        </tbody>
      </table>
    </Panel>
  );
}
