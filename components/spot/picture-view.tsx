import { useState, type PointerEvent } from 'react';
import { View } from 'react-native';
import { useTheme } from '@/components/theme';
import { Label } from '@/components/ui';
import type { Region } from '@/shared/spot/intensities';
import { regionBetween } from '@/shared/spot/setting';

interface PictureViewProps {
  onVideo: (element: HTMLVideoElement | null) => void;
  open: boolean;
  /** Null while there is no picture. */
  picture: { width: number; height: number } | null;
  region: Region | null;
  spotPx: number | null;
  linePx: number | null;
  onRegion: (region: Region) => void;
  onLine: (px: number) => void;
}

interface Point {
  x: number;
  y: number;
}

/** Less than this is a tap and not a drag, px of the picture. */
const tapPx = 8;

/** What the camera sees, with the region and the spot in it. A drag draws the region, a tap sets the line; both can be typed as well. */
export function PictureView({ onVideo, open, picture, region, spotPx, linePx, onRegion, onLine }: PictureViewProps) {
  const { colors } = useTheme();
  const [from, setFrom] = useState<Point | null>(null);
  const [to, setTo] = useState<Point | null>(null);
  const at = (event: PointerEvent): Point | null => {
    const box = event.currentTarget.getBoundingClientRect();
    if (picture === null || box.width === 0) return null;
    return {
      x: ((event.clientX - box.left) / box.width) * picture.width,
      y: ((event.clientY - box.top) / box.height) * picture.height,
    };
  };
  const dragged = from !== null && to !== null && Math.hypot(from.x - to.x, from.y - to.y) >= tapPx;
  const lift = () => {
    if (picture !== null && from !== null) {
      if (dragged) onRegion(regionBetween(from, to, picture));
      else onLine(Math.round(from.x));
    }
    setFrom(null);
    setTo(null);
  };
  const drawn = dragged && picture !== null ? regionBetween(from, to, picture) : region;
  return (
    <View className="w-full max-w-[640px] gap-2">
      <div
        data-testid="spot-picture"
        className="relative touch-none overflow-hidden rounded-panel bg-ink"
        style={{ display: open ? 'block' : 'none', cursor: 'crosshair' }}
        onPointerDown={(event) => {
          event.currentTarget.setPointerCapture(event.pointerId);
          setFrom(at(event));
          setTo(at(event));
        }}
        onPointerMove={(event) => (from === null ? undefined : setTo(at(event)))}
        onPointerUp={lift}
        onPointerCancel={() => setFrom(null)}
      >
        <video ref={onVideo} muted playsInline aria-hidden style={{ display: 'block', width: '100%' }} />
        {picture === null ? null : (
          <svg
            aria-hidden
            viewBox={`0 0 ${picture.width} ${picture.height}`}
            preserveAspectRatio="none"
            style={{ position: 'absolute', inset: 0, width: '100%', height: '100%' }}
          >
            {drawn === null ? null : (
              <rect
                x={drawn.left}
                y={drawn.top}
                width={drawn.width}
                height={drawn.height}
                fill="none"
                stroke={colors.lamp}
                strokeWidth={2}
                vectorEffect="non-scaling-stroke"
              />
            )}
            {linePx === null ? null : <Upright px={linePx} height={picture.height} color={colors.far} dashed />}
            {spotPx === null ? null : <Upright px={spotPx} height={picture.height} color={colors.near} />}
          </svg>
        )}
      </div>
      {picture === null ? null : (
        <Label>Drag to draw the region, tap to set the dashed line for a mark. Whole line: where the spot is read.</Label>
      )}
    </View>
  );
}

/** Columns are counted from the middle of the leftmost one. */
function Upright({ px, height, color, dashed = false }: { px: number; height: number; color: string; dashed?: boolean }) {
  return (
    <line
      x1={px + 0.5}
      x2={px + 0.5}
      y1={0}
      y2={height}
      stroke={color}
      strokeWidth={dashed ? 2 : 1.5}
      strokeDasharray={dashed ? '6 4' : undefined}
      vectorEffect="non-scaling-stroke"
    />
  );
}
