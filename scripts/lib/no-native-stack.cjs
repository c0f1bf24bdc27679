/** In place of expo-router's native stack, which is made when the router loads and never shown: every layout of the application is a slot. */
module.exports.createNativeStackNavigator = () => ({ Navigator: () => null });
