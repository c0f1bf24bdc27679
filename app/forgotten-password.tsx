import { ForgottenPasswordScreen } from '@/components/people/forgotten-password-screen';

export default function ForgottenPassword() {
  return <ForgottenPasswordScreen />;
}
