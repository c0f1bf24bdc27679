import { ResetPasswordScreen } from '@/components/people/reset-password-screen';

export default function ResetPassword() {
  return <ResetPasswordScreen />;
}
