import { View } from 'react-native';
import Svg, { Circle, G, Line, Path, Rect, Text as SvgText } from 'react-native-svg';
import { useTheme, type ThemeColors } from '@/components/theme';
import { formatDegrees } from '@/shared/lib/format-angle';
import { formatFixed } from '@/shared/lib/format-number';
import type { CurvePoint, StationsFacts } from '@/shared/planning/station-facts';
import { Axes, mapInto, roomy, type Mapped } from './chart-frame';
import { pathOf } from './curve';
import { HiddenTable } from './hidden-table';
import { laneOf } from './strip-model';
import { useWidth } from './use-width';

const left = 54;
const top = 24;
const plotPx = 190;
const heightPx = top + plotPx + 40;
const PICO = 1e12;
/** The hidden table tells every so many degrees. */
const TABLE_DEG = 5;

/** Torque on the pendulum over the turntable angle, where the masses may stand, and the stations on it. */
export function TorquePlot({ facts }: { facts: StationsFacts }) {
  const { colors } = useTheme();
  const { width, onLayout } = useWidth(320);
  const { curve, greatest } = facts;
  const drawn = curve.filter(({ state }) => state !== 'touching');
  const fromDeg = (curve[0] as CurvePoint).angleDeg;
  const box = { left, top, width: width - left - 10, height: plotPx };
  const scale = {
    x: [fromDeg, fromDeg + 180] as [number, number],
    y: roomy(
      drawn.map(({ torqueNm }) => torqueNm * PICO),
      0.2,
    ),
  };
  const map = mapInto(box, scale);
  const words = `Torque over the turntable angle: greatest within reach ${formatFixed(greatest.torqueNm * PICO, { decimals: 1 })} pN m at ${formatDegrees(greatest.angleDeg)}.`;
  return (
    <View onLayout={onLayout} className="w-full min-w-0" testID="torque-plot">
      <View role="img" aria-label={words} style={{ height: heightPx }}>
        <Svg width={width} height={heightPx} viewBox={`0 0 ${width} ${heightPx}`} aria-hidden>
          {closedArcs(curve).map(([from, to]) => (
            <Rect
              key={from}
              x={map.toX(from)}
              width={Math.max(1, map.toX(to) - map.toX(from))}
              y={top}
              height={plotPx}
              fill={colors.danger}
              opacity={0.18}
            />
          ))}
          <Axes box={box} scale={scale} colors={colors} yUnit="torque, pN m" xUnit="turntable angle, degrees" xTicks={6} />
          {stretches(drawn).map((points) => (
            <Path
              key={(points[0] as CurvePoint).angleDeg}
              d={pathOf([points.map(({ angleDeg, torqueNm }) => [map.toX(angleDeg), map.toY(torqueNm * PICO)])])}
              stroke={colors.text}
              strokeWidth={2}
              fill="none"
            />
          ))}
          <Line
            x1={map.toX(greatest.angleDeg)}
            x2={map.toX(greatest.angleDeg)}
            y1={top}
            y2={top + plotPx}
            stroke={colors.lamp}
            strokeWidth={1.5}
            strokeDasharray="5 4"
          />
          <Stations facts={facts} map={map} fromDeg={fromDeg} colors={colors} />
        </Svg>
      </View>
      <HiddenTable
        caption={words}
        columns={['Turntable angle', 'Torque in pN m', 'May the masses stand there']}
        rows={curve
          .filter((_, index) => index % TABLE_DEG === 0)
          .map(({ angleDeg, torqueNm, state }) => [
            formatDegrees(angleDeg, 0),
            state === 'touching' ? '–' : formatFixed(torqueNm * PICO, { decimals: 2 }),
            state === 'reached' ? 'yes' : state === 'touching' ? 'no, they would touch' : 'no, kept out',
          ])}
      />
    </View>
  );
}

function Stations({ facts, map, fromDeg, colors }: { facts: StationsFacts; map: Mapped; fromDeg: number; colors: ThemeColors }) {
  const highNm = Math.abs(facts.greatest.torqueNm);
  return (
    <G>
      {marksOf(facts, fromDeg).map(({ name, angleDeg, torqueNm }) => {
        const lane = laneOf(name);
        const color = lane === 'near' ? colors.near : lane === 'far' ? colors.far : colors.dim;
        const [x, y] = [map.toX(angleDeg), map.toY(torqueNm * PICO)];
        const place = labelPlace({ angleDeg, torqueNm, fromDeg, highNm });
        return (
          <G key={name}>
            <Circle cx={x} cy={y} r={5} fill={color} stroke={colors.ink} strokeWidth={1.5} />
            {/* The ground comes first, wider: neither the curve nor the dashed line runs through a name. */}
            {[colors.ink, 'none'].map((halo) => (
              <SvgText
                key={halo}
                x={x + place.dx}
                y={y + place.dy}
                textAnchor={place.anchor}
                fontSize={13}
                fontFamily="Atkinson Hyperlegible Next"
                fill={halo === 'none' ? colors.text : halo}
                stroke={halo}
                strokeWidth={halo === 'none' ? 0 : 5}
                strokeLinejoin="round"
              >
                {name}
              </SvgText>
            ))}
          </G>
        );
      })}
    </G>
  );
}

/** Above what turns the pendulum one way, below what turns it the other; beside the curve where it runs steeply through nothing, px. */
function labelPlace({ angleDeg, torqueNm, fromDeg, highNm }: { angleDeg: number; torqueNm: number; fromDeg: number; highNm: number }) {
  if (angleDeg < fromDeg + 15) return { anchor: 'start', dx: 4, dy: torqueNm < 0 ? 20 : -10 } as const;
  if (angleDeg > fromDeg + 165) return { anchor: 'end', dx: -4, dy: torqueNm < 0 ? 20 : -10 } as const;
  if (Math.abs(torqueNm) < 0.1 * highNm) return { anchor: 'end', dx: -12, dy: -8 } as const;
  return { anchor: 'middle', dx: 0, dy: torqueNm < 0 ? 20 : -10 } as const;
}

/** Stations as they fall into the half turn shown; of those at one angle the first named. */
function marksOf({ stations }: StationsFacts, fromDeg: number) {
  const seen = new Set<string>();
  return stations.flatMap(({ name, angleDeg, torque }) => {
    const shown = fromDeg + ((((angleDeg - fromDeg) % 180) + 180) % 180);
    const key = shown.toFixed(1);
    if (seen.has(key)) return [];
    seen.add(key);
    return [{ name, angleDeg: shown, torqueNm: torque.value }];
  });
}

/** Neighbouring points, degree by degree. */
function stretches(points: readonly CurvePoint[]): CurvePoint[][] {
  const found: CurvePoint[][] = [];
  for (const point of points) {
    const last = found.at(-1);
    if (last !== undefined && point.angleDeg - (last.at(-1) as CurvePoint).angleDeg < 1.5) last.push(point);
    else found.push([point]);
  }
  return found;
}

/** Where the masses may not stand, from and to, in deg. */
const closedArcs = (curve: readonly CurvePoint[]): [number, number][] =>
  stretches(curve.filter(({ state }) => state !== 'reached')).map((points) => [
    (points[0] as CurvePoint).angleDeg,
    (points.at(-1) as CurvePoint).angleDeg,
  ]);
