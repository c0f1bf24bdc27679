import '../global.css';
import { Slot } from 'expo-router';
import { ApiProvider } from '@/components/api';
import { SignInAgain } from '@/components/people/sign-in-again';
import { ThemeProvider } from '@/components/theme';
import { ToastProvider } from '@/components/ui';

export default function RootLayout() {
  return (
    <ThemeProvider>
      <ApiProvider>
        <ToastProvider>
          <Slot />
          <SignInAgain />
        </ToastProvider>
      </ApiProvider>
    </ThemeProvider>
  );
}
