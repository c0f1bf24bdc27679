import { SendPicturesScreen } from '@/components/shell/lazy-screens';

export default function SendPictures() {
  return <SendPicturesScreen />;
}
