import { SignInScreen } from '@/components/people/sign-in-screen';

export default function SignIn() {
  return <SignInScreen />;
}
